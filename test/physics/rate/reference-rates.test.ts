import { describe, expect, it } from 'vitest';
import { type Cutoff, standardHalo } from '../../../physics/halo/standard-halo.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import type { Mediator } from '../../../physics/mediator/mediator.ts';
import { crystalRate } from '../../../physics/rate/crystal-rate.ts';
import reference from '../../fixtures/rates.json' with { type: 'json' };
import { referenceTable } from '../../support/reference-table.ts';

type Case = (typeof reference.cases)[number];

function scenarioOf(c: Case) {
  const mediator: Mediator =
    typeof c.mediator === 'string'
      ? { kind: c.mediator as 'heavy' | 'light' }
      : { kind: 'massive', massEv: parseFloat(c.mediator.mass) * 1e3 };
  return {
    massEv: parseFloat(c.mass) * 1e6,
    crossSectionCm2: 1e-37,
    mediator,
    splittingEv: parseFloat(c.massSplitting),
    localDensityGevPerCm3: 0.3,
    halo: standardHalo({
      circularSpeedKmPerS: c.halo.circularSpeed,
      laboratorySpeedKmPerS: c.halo.laboratorySpeed,
      escapeSpeedKmPerS: c.halo.escapeSpeed,
      cutoff: c.halo.cutoff as Cutoff,
    }),
    table: referenceTable(c.table),
    ionization: stepIonization(1.12, 3.8),
    energyPerPairEv: 3.8,
    maxElectrons: c.bins.length,
  };
}

const title = (c: Case): string =>
  `${c.table}, ${c.mass}, ${JSON.stringify(c.mediator)}, δ ${c.massSplitting}, v_E ${c.halo.laboratorySpeed}, ${c.halo.cutoff}`;

describe('crystalRate against an independent high-order integration (fixtures/recipe/rates.py)', () => {
  it.each(reference.cases.map((c) => [title(c), c] as const))('%s', (_, c) => {
    const rate = crystalRate(scenarioOf(c));
    const computed = [...rate.bins.map((bin) => bin.rate), rate.overflow];
    const expected = [...c.bins, c.overflow];
    const errors = [...c.binErrors, c.overflowError];
    const total = expected.reduce((a, b) => a + b, 0);
    expect(computed).toHaveLength(expected.length);
    computed.forEach((r, i) => {
      const where = `bin ${i + 1}: ${r.value} ± ${r.relativeError}, expected ${expected[i]} ± ${errors[i]}`;
      if (expected[i] === 0) {
        expect(r, where).toEqual({ value: 0, relativeError: 0 });
        return;
      }
      const deviation = Math.abs(r.value / expected[i] - 1);
      if (expected[i] > 1e-6 * total) expect(deviation, where).toBeLessThan(2e-4 + errors[i]);
      expect(r.relativeError, where).toBeGreaterThanOrEqual((deviation - errors[i]) / 2 - 1e-11); // 12 digits in the fixture
    });
  });
});
