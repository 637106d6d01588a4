import { describe, expect, it } from 'vitest';
import { REFERENCE_MOMENTUM_EV } from '../../../physics/constants.ts';
import type { CrystalTable } from '../../../physics/crystal/crystal-table.ts';
import { columnsOf, formFactorPerValue, rowsOf } from '../../../physics/crystal/crystal-table.ts';
import { meanFifthPower } from '../../../physics/crystal/fifth-power.ts';
import { cellsOf, coarserEdges, finerEdges, regridded } from '../../../physics/crystal/regrid.ts';
import { sumRule } from '../../../physics/crystal/sum-rule.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import { gaussLegendre } from '../../../physics/numeric/gauss-legendre.ts';
import { crystalRate } from '../../../physics/rate/crystal-rate.ts';
import { builtInTable } from '../../support/built-in-table.ts';
import { formFactorOf, oscillator } from '../../support/dielectric-models.ts';

/** ∫∫ |f|² dq dE over a rectangle of whole cells of a table of cells, eV². */
function integral(table: CrystalTable, q: readonly [number, number], e: readonly [number, number]): number {
  const { momentumEv, energyEv, values } = table;
  const perFifth = formFactorPerValue(table)(1);
  let sum = 0;
  for (let i = 0; i < rowsOf(table); i++) {
    const [a, b] = [momentumEv[i], momentumEv[i + 1]];
    if (a < q[0] || b > q[1]) continue;
    const measure = table.quantity === 'formFactorSquared' ? b - a : perFifth * (b - a) * meanFifthPower(a, b);
    for (let j = 0; j < columnsOf(table); j++) {
      if (energyEv[j] >= e[0] && energyEv[j + 1] <= e[1])
        sum += measure * (energyEv[j + 1] - energyEv[j]) * values[i * columnsOf(table) + j];
    }
  }
  return sum;
}

const { table: silicon } = builtInTable('silicon', true);
/** The same numbers as a loss function: not physics, but cells whose |f|² carries q⁵. */
const loss: CrystalTable = { ...silicon, quantity: 'lossFunction' };
const halo = standardHalo({
  circularSpeedKmPerS: 238,
  escapeSpeedKmPerS: 544,
  laboratorySpeedKmPerS: 250,
  cutoff: 'sharp',
});

function binsOf(table: CrystalTable, massEv: number, kind: 'heavy' | 'light'): number[] {
  const rate = crystalRate({
    massEv,
    crossSectionCm2: 1e-37,
    mediator: { kind },
    splittingEv: 0,
    localDensityGevPerCm3: 0.3,
    halo,
    table,
    ionization: stepIonization(1.12, 3.8),
    energyPerPairEv: 3.8,
    maxElectrons: 8,
  });
  return rate.bins.map((bin) => bin.rate.value);
}

describe('regridded', () => {
  it.each([
    ['form factor', silicon],
    ['loss function', loss],
  ])('%s: ∫∫ |f|² dq dE over every new cell, and over old ones that stay, is what it was', (_name, table) => {
    const q = coarserEdges(table.momentumEv, 90);
    const e = coarserEdges(table.energyEv, 100, [1.12]);
    const merged = regridded(table, q, e);
    expect([rowsOf(merged), columnsOf(merged)]).toEqual([90, 102]);
    let compared = 0;
    for (let i = 0; i < 90; i += 7) {
      for (let j = 0; j < 100; j += 9) {
        const cell = [[q[i], q[i + 1]] as const, [e[j], e[j + 1]] as const] as const;
        const [was, is] = [integral(table, ...cell), integral(merged, ...cell)];
        expect(Math.abs(is - was)).toBeLessThanOrEqual(1e-12 * was);
        compared++;
      }
    }
    expect(compared).toBe(156);
    const all = [
      [0, Infinity],
      [0, Infinity],
    ] as const;
    expect(integral(merged, ...all) / integral(table, ...all)).toBeCloseTo(1, 12);
  });

  it('edges that cut old cells: the whole is kept, and so is the f-sum where energies stay', () => {
    const last = silicon.momentumEv[720];
    const q = Float64Array.from({ length: 101 }, (_, i) => (i === 100 ? last : (last * i * i) / 1e4));
    const moved = regridded(silicon, q, silicon.energyEv);
    const all = [
      [0, Infinity],
      [0, Infinity],
    ] as const;
    expect(integral(moved, ...all) / integral(silicon, ...all)).toBeCloseTo(1, 12);
    const own = sumRule(silicon, 8);
    const share = sumRule(moved, 8);
    // at 3 keV cells of 1.2 keV and 0.09 keV have the same share to second order
    const at = (rule: typeof own) => rule.share[rule.momentumEv.findIndex((k) => k > 0.8 * REFERENCE_MOMENTUM_EV)];
    expect(Math.abs(at(share) / at(own) - 1)).toBeLessThan(0.03);
  });

  it('splitting cells changes no number but the axes, and no rate (3e-4: the integration)', () => {
    const fine = regridded(silicon, finerEdges(silicon.momentumEv, 2), finerEdges(silicon.energyEv, 2));
    expect(fine.values).toHaveLength(4 * silicon.values.length);
    // cell (700, 77) of the finer table lies in cell (350, 38)
    expect(fine.values[700 * 1000 + 77] / silicon.values[350 * 500 + 38]).toBeCloseTo(1, 13);
    const [was, is] = [binsOf(silicon, 1e7, 'heavy'), binsOf(fine, 1e7, 'heavy')];
    was.forEach((rate, n) => expect(Math.abs(is[n] - rate)).toBeLessThanOrEqual(3e-4 * rate));
    expect(was.filter((rate) => rate > 0)).toHaveLength(8);
    const back = regridded(fine, silicon.momentumEv, silicon.energyEv);
    back.values.forEach((value, at) => {
      if (Math.abs(value - silicon.values[at]) > 1e-12 * silicon.values[at]) throw new Error(`value ${at}`);
    });
  });

  // measured, rounded up: heavy and light, 3, 10 and 100 MeV, bins above 1e-3 of the total
  it.each([
    [360, 250, 0.01],
    [180, 125, 0.04],
  ])('merged to %s × %s cells, rates are those of 720 × 500 within %s', (rows, columns, within) => {
    const q = coarserEdges(silicon.momentumEv, rows);
    const e = coarserEdges(silicon.energyEv, columns, [1.12]);
    const merged = regridded(silicon, q, e);
    let compared = 0;
    for (const massEv of [3e6, 1e7, 1e8]) {
      for (const kind of ['heavy', 'light'] as const) {
        const [was, is] = [binsOf(silicon, massEv, kind), binsOf(merged, massEv, kind)];
        const total = was.reduce((a, b) => a + b, 0);
        was.forEach((rate, n) => {
          if (rate < 1e-3 * total) return;
          expect(Math.abs(is[n] / rate - 1), `${massEv} eV, ${kind}, n = ${n + 1}`).toBeLessThan(within);
          compared++;
        });
      }
    }
    expect(compared).toBeGreaterThan(25);
  });

  it('refuses points, and edges that begin, end or go elsewhere', () => {
    const points = formFactorOf('points', Float64Array.from([0, 1, 2]), Float64Array.from([0, 1, 0]));
    expect(() => regridded(points, points.momentumEv, points.energyEv)).toThrow(/axes/);
    const { momentumEv, energyEv } = silicon;
    expect(() => regridded(silicon, momentumEv.slice(1), energyEv)).toThrow(/momentum/);
    expect(() => regridded(silicon, momentumEv, energyEv.slice(0, 400))).toThrow(/energy/);
    expect(() => regridded(silicon, momentumEv, Float64Array.from([0, 5, 5, 50]))).toThrow(/energy/);
    expect(() => cellsOf(silicon)).toThrow(/axes/);
  });
});

describe('coarserEdges, finerEdges', () => {
  const axis = Float64Array.from([0, 1, 2, 3, 4, 5, 6, 7]);
  it.each([
    [7, [], [0, 1, 2, 3, 4, 5, 6, 7]],
    [4, [], [0, 2, 4, 6, 7]],
    [1, [], [0, 7]],
    [2, [2.5], [0, 2, 3, 4, 7]],
    [2, [3], [0, 3, 4, 7]],
  ])('at most %s cells, keeping %j: %j', (most, keep, expected) => {
    expect(Array.from(coarserEdges(axis, most, keep))).toEqual(expected);
  });

  it('three parts of each cell', () => {
    const fine = finerEdges(Float64Array.from([0, 3, 9]), 3);
    expect(Array.from(fine)).toEqual([0, 1, 2, 3, 5, 7, 9]);
  });
});

describe('cellsOf', () => {
  it.each(['formFactorSquared', 'lossFunction'] as const)(
    '%s: ∫∫ |f|² of the bilinear table, by Gauss–Legendre over each cell',
    (quantity) => {
      const energyEv = Float64Array.from([0, 4, 10, 17, 30]);
      const plain = formFactorOf('points', energyEv, energyEv.map(oscillator(16.6, 4.8, 4).imaginary));
      const bent = plain.values.map((value, at) => value * (1 + (at % 5)) ** 2);
      const table: CrystalTable = { ...plain, quantity, values: bent };
      const cells = cellsOf(table);
      const rule = gaussLegendre(6);
      const perValue = formFactorPerValue(table);
      let compared = 0;
      for (let i = 0; i < 2; i++) {
        for (let j = 0; j < 4; j++) {
          const [a, b] = [table.momentumEv[i], table.momentumEv[i + 1]];
          let expected = 0;
          rule.nodes.forEach((x, k) => {
            const t = (1 + x) / 2;
            const at = (row: number): number => (bent[row * 5 + j] + bent[row * 5 + j + 1]) / 2;
            expected += (rule.weights[k] / 2) * perValue(a + (b - a) * t) * ((1 - t) * at(i) + t * at(i + 1));
          });
          expected *= (b - a) * (energyEv[j + 1] - energyEv[j]);
          const actual = integral(cells, [a, b], [energyEv[j], energyEv[j + 1]]);
          expect(actual / expected).toBeCloseTo(1, 12);
          compared++;
        }
      }
      expect(compared).toBe(8);
    },
  );
});
