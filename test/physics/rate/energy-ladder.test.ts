import { describe, expect, it } from 'vitest';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { fanoIonization } from '../../../physics/ionization/fano.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import { crystalRate } from '../../../physics/rate/crystal-rate.ts';
import { ladderBinning, ladderScenario, MOST_STEPS } from '../../../physics/rate/energy-ladder.ts';
import { response, responseRates } from '../../../physics/rate/response.ts';
import { builtInTable } from '../../support/built-in-table.ts';

const halo = standardHalo({
  circularSpeedKmPerS: 238,
  escapeSpeedKmPerS: 544,
  laboratorySpeedKmPerS: 250,
  cutoff: 'sharp',
});
const scenario = {
  massEv: 1e7,
  crossSectionCm2: 1e-37,
  mediator: { kind: 'light' } as const,
  splittingEv: 0,
  localDensityGevPerCm3: 0.3,
  table: builtInTable('silicon', true).table,
};
const maxElectrons = 5;

/** Largest relative difference from crystalRate over gaps, energies per pair and models, bins above 1e-3 of the total. */
function largestDifference(stepEv: number) {
  const ladder = { fromEv: 1, stepEv, steps: Math.round(35 / stepEv) };
  const steps = responseRates(response(ladderScenario(scenario, ladder), 800), halo);
  let [largest, compared] = [0, 0];
  for (const [gap, perPair] of [
    [1.12, 3.8],
    [1.17, 3.63],
    [1.071, 3.925],
  ]) {
    for (const ionization of [stepIonization(gap, perPair), fanoIonization(gap, perPair, 0.12)]) {
      const direct = crystalRate({ ...scenario, halo, ionization, energyPerPairEv: perPair, maxElectrons });
      const bins = ladderBinning(ladder)(steps, ionization, maxElectrons);
      direct.bins.forEach(({ rate }, i) => {
        if (rate.value < 1e-3 * direct.total.value) return;
        largest = Math.max(largest, Math.abs(bins[i] / rate.value - 1));
        compared++;
      });
    }
  }
  return { largest, compared };
}

describe('ladderBinning: ionization drawn after the integration', () => {
  it('agrees with crystalRate to 2e-3 with steps of 0.1 eV, and better with narrower ones', () => {
    const [coarse, fine] = [0.1, 0.05].map(largestDifference);
    expect(coarse.compared).toBeGreaterThanOrEqual(18);
    expect(coarse.largest).toBeLessThan(2e-3);
    expect(fine.largest).toBeLessThan(0.6 * coarse.largest);
  });

  it('puts each step into its bin, divided where the bins divide it, and nothing below the gap', () => {
    const ladder = { fromEv: 1, stepEv: 1, steps: 6 };
    const bins = ladderBinning(ladder)([10, 10, 10, 10, 10, 10], stepIonization(1.25, 2.5), 2);
    // [1.25, 3.75) and [3.75, 6.25) of a ladder from 1 to 7 eV, 10 an eV
    expect(Array.from(bins)).toEqual([25, 25]);
  });

  it('refuses a gap below the ladder and a ladder out of its domain', () => {
    const ladder = { fromEv: 1.2, stepEv: 0.1, steps: 10 };
    expect(() => ladderBinning(ladder)(new Array(10).fill(0), stepIonization(1.12, 3.8), 3)).toThrow(/bandGap/);
    for (const bad of [
      { ...ladder, fromEv: -1 },
      { ...ladder, stepEv: 0 },
      { ...ladder, steps: 2.5 },
      { ...ladder, steps: MOST_STEPS + 1 },
    ])
      expect(() => ladderScenario(scenario, bad)).toThrow(/energy|Energy/);
  });
});
