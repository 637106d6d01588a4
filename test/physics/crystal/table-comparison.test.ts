import { describe, expect, it } from 'vitest';
import type { CrystalTable } from '../../../physics/crystal/crystal-table.ts';
import { compareTables } from '../../../physics/crystal/table-comparison.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import { crystalRate, type RateScenario } from '../../../physics/rate/crystal-rate.ts';
import { builtInTable } from '../../support/built-in-table.ts';

const scenario: Omit<RateScenario, 'table'> = {
  massEv: 1e7,
  crossSectionCm2: 1e-37,
  mediator: { kind: 'heavy' },
  splittingEv: 0,
  localDensityGevPerCm3: 0.3,
  halo: standardHalo({
    circularSpeedKmPerS: 238,
    escapeSpeedKmPerS: 544,
    laboratorySpeedKmPerS: 250,
    cutoff: 'sharp',
  }),
  ionization: stepIonization(1.12, 3.8),
  energyPerPairEv: 3.8,
  maxElectrons: 8,
};
const { table: screened } = builtInTable('silicon', true);
const { table: unscreened } = builtInTable('silicon', false);

/** The table with its values between two momenta (eV) and two energies (eV) multiplied. */
function changed(table: CrystalTable, q: readonly number[], e: readonly number[], factor: number): CrystalTable {
  const columns = table.energyEv.length - 1;
  const isInside = (axis: Float64Array, i: number, [from, to]: readonly number[]): boolean =>
    axis[i] >= from && axis[i + 1] <= to;
  const values = table.values.map((value, at) => {
    const [i, j] = [Math.floor(at / columns), at % columns];
    return isInside(table.momentumEv, i, q) && isInside(table.energyEv, j, e) ? factor * value : value;
  });
  return { ...table, values };
}

describe('compareTables', () => {
  it('screened against unscreened silicon: bins are those of crystalRate, blocks add up to the rates and to the difference', () => {
    const result = compareTables(scenario, screened, unscreened);
    const [own, other] = [screened, unscreened].map((table) => crystalRate({ ...scenario, table }));
    expect(result.bins).toHaveLength(8);
    result.bins.forEach(({ baseline, candidate, ratio }, n) => {
      expect(baseline).toEqual(own.bins[n].rate);
      expect(candidate).toEqual(other.bins[n].rate);
      expect(ratio).toBe(candidate.value / baseline.value);
      expect(ratio).toBeGreaterThan(1); // screening takes away
    });
    const sum = (of: 'baseline' | 'candidate' | 'difference'): number =>
      result.blocks.reduce((total, block) => total + block[of], 0);
    expect(sum('baseline') / result.baseline).toBeCloseTo(1, 12);
    expect(sum('candidate') / result.candidate).toBeCloseTo(1, 12);
    expect(sum('difference')).toBeCloseTo(result.ratio! - 1, 12);
    expect(result.baseline).toBeCloseTo(own.total.value + own.overflow.value, 9);
    // a block's rate in a bin: the same integral, cut elsewhere
    const second = result.blocks.filter(({ energyEv }) => energyEv.from === 4.92);
    expect(second.length).toBeGreaterThan(5);
    const bin = second.reduce((total, block) => total + block.baseline, 0);
    expect(Math.abs(bin / own.bins[1].rate.value - 1)).toBeLessThan(3e-4);
    const sizes = result.blocks.map(({ difference }) => Math.abs(difference));
    expect(sizes).toEqual([...sizes].sort((a, b) => b - a));
  });

  it('a table against its double: ratio 2 in every bin', () => {
    const doubled = { ...screened, values: screened.values.map((value) => 2 * value) };
    const result = compareTables(scenario, screened, doubled);
    expect(result.ratio).toBeCloseTo(2, 12);
    for (const { ratio } of result.bins) expect(ratio).toBeCloseTo(2, 12);
  });

  it('a table against itself: no block makes a difference', () => {
    expect(compareTables(scenario, screened, screened).blocks).toEqual([]);
  });

  it('a region that was changed is the region that is named', () => {
    const result = compareTables(scenario, screened, changed(screened, [5000, 9000], [8.72, 12.52], 1.5));
    const inside = result.blocks.filter(
      ({ momentumEv, energyEv }) =>
        momentumEv.to > 5000 && momentumEv.from < 9000 && energyEv.to > 8.71 && energyEv.from < 12.53,
    );
    const whole = result.ratio! - 1;
    expect(whole).toBeGreaterThan(0.01);
    const named = inside.reduce((total, { difference }) => total + difference, 0);
    expect(named / whole).toBeCloseTo(1, 2);
    expect(result.blocks[0].energyEv.from).toBe(8.72);
  });

  it('a table that ends earlier loses what lies beyond; out of reach nothing differs', () => {
    const columns = 300;
    const short: CrystalTable = {
      ...screened,
      energyEv: screened.energyEv.slice(0, columns + 1),
      values: Float64Array.from(
        Array.from({ length: 720 }, (_, i) => Array.from(screened.values.subarray(i * 500, i * 500 + columns))).flat(),
      ),
    };
    const heavy = { ...scenario, massEv: 1e8 };
    const result = compareTables(heavy, screened, short);
    const beyond = result.blocks.filter(({ energyEv }) => energyEv.to > 30);
    expect(beyond.reduce((total, { difference }) => total + difference, 0)).toBeCloseTo(result.ratio! - 1, 3);
    expect(result.ratio).toBeLessThan(1);
    const unreached = compareTables({ ...scenario, massEv: 1e5 }, screened, unscreened);
    expect([unreached.baseline, unreached.candidate, unreached.ratio]).toEqual([0, 0, undefined]);
    expect(unreached.blocks).toEqual([]);
    expect(unreached.bins.map(({ ratio }) => ratio)).toEqual(new Array(8).fill(undefined));
  });
});
