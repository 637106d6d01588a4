import { describe, expect, it } from 'vitest';
import { ELECTRON_MASS_EV, REFERENCE_MOMENTUM_EV } from '../../../physics/constants.ts';
import { cellVolumePerEv3 } from '../../../physics/crystal/crystal-table.ts';
import { energyMoments, fullResponseEv2, sumRule } from '../../../physics/crystal/sum-rule.ts';
import { builtInTable } from '../../support/built-in-table.ts';
import { CELL, electronsOfPlasma, formFactorOf } from '../../support/dielectric-models.ts';
import { ridgeTable } from '../../support/exact-tables.ts';

describe('sumRule: checks with an exact answer', () => {
  it('free electrons at rest have all of it at every momentum (|f|² = N q³ δ(E − q²/2mₑ)/(2 α mₑ²), Essig et al. 2012)', () => {
    const { share, momentumEv } = sumRule(ridgeTable(1e7, 794, 500), 8);
    expect(share).toHaveLength(500);
    // the ridge is a straight band in each cell: the error is of second order in Δq/q
    share.forEach((value, i) => {
      const step = (momentumEv[1] - momentumEv[0]) / momentumEv[i];
      expect(Math.abs(value - 1), `row ${i}`).toBeLessThan(step ** 2 / 3);
    });
    expect(share[499]).toBeCloseTo(1, 5);
  });

  it('an undamped plasmon Im[−1/ε] = (π/2) ω_p δ(E − ω_p) has all of it (Nozières & Pines 1959), as loss function and as |f|²', () => {
    const plasma = 16.6;
    const electrons = electronsOfPlasma(plasma);
    const edges = Float64Array.from([0, plasma - 0.01, plasma + 0.01, 30]);
    const response = Float64Array.from([0, ((Math.PI / 2) * plasma) / 0.02, 0]);
    const formFactor = formFactorOf('edges', edges, response);
    const loss = {
      ...formFactor,
      quantity: 'lossFunction' as const,
      values: Float64Array.from([...response, ...response, ...response]),
    };
    for (const table of [formFactor, loss]) {
      const { share } = sumRule(table, electrons);
      expect(share).toHaveLength(3);
      for (const value of share) expect(value).toBeCloseTo(1, 12);
    }
    expect(fullResponseEv2(electrons, cellVolumePerEv3(CELL))).toBeCloseTo((Math.PI * plasma ** 2) / 2, 9);
  });

  it('points: ∫ E g dE of straight lines by hand, and no share at q = 0', () => {
    const energyEv = Float64Array.from([0, 1, 3]);
    const table = formFactorOf('points', energyEv, Float64Array.from([0, 1, 0]));
    // ∫₀¹ E² dE + ∫₁³ E (3 − E)/2 dE = 1/3 + 5/3
    expect(energyMoments({ ...table, values: Float64Array.from([0, 1, 0, 0, 2, 0, 0, 0, 0]) })).toEqual(
      Float64Array.from([2, 4, 0]),
    );
    const plasma = Math.sqrt(4 / Math.PI); // π ω_p²/2 = 2
    const { share } = sumRule(table, electronsOfPlasma(plasma));
    for (const value of share) expect(value).toBeCloseTo(1, 12);
    const atZero = sumRule({ ...table, momentumEv: Float64Array.from([0, 250, 300]) }, 8);
    expect(atZero.momentumEv).toEqual(Float64Array.from([250, 300]));
    expect(atZero.share).toHaveLength(2);
  });

  it('nearOne: q²/2mₑ + q p_F/mₑ reaches the last energy at its end', () => {
    const { nearOne } = sumRule(builtInTable('silicon', false).table, 8);
    const fermi = Math.cbrt((3 * Math.PI ** 2 * 8) / 40.0479) * 1973.269804; // 1/Å × ħc, CODATA
    const q = nearOne.toEv;
    expect((q * q) / (2 * ELECTRON_MASS_EV) + (q * fermi) / ELECTRON_MASS_EV).toBeCloseTo(50, 5);
    expect(nearOne.fromEv).toBe(0);
  });

  it.each([0, -1, Number.NaN, Infinity])('refuses %s electrons', (electrons) => {
    expect(() => sumRule(builtInTable('silicon', true).table, electrons)).toThrow(/electronsPerCell/);
  });
});

describe('sumRule: built-in tables', () => {
  // peak: tables/README.md, "the shipped (shifted) tables' own f-sum share"; the rest measured here. Range 0.05 < q/α mₑ < 1.
  it.each([
    ['silicon', 8, 1.03, 0.88, 1.03],
    ['germanium', 28, 0.38, 0.31, 0.385],
    ['diamond', 8, 1.06, 0.94, 1.065],
    ['gallium-arsenide', 28, 0.4, 0.32, 0.415],
  ])('%s, %s electrons: peak of the share near %s', (crystal, electrons, peak, from, to) => {
    const { share, momentumEv } = sumRule(builtInTable(crystal, false).table, electrons);
    expect(Math.abs(Math.max(...share) - peak)).toBeLessThan(0.015);
    const inside = share.filter((_, i) => {
      const q = momentumEv[i] / REFERENCE_MOMENTUM_EV;
      return q > 0.05 && q < 1;
    });
    expect(inside).toHaveLength(38);
    expect(Math.min(...inside)).toBeGreaterThan(from);
    expect(Math.max(...inside)).toBeLessThan(to);
  });

  it.each([true, false])('silicon, screened %s: 0.85 to 1.05 for 0.05 < q/α mₑ < 1 below 50 eV', (screened) => {
    const { share, momentumEv } = sumRule(builtInTable('silicon', screened).table, 8);
    const inside = share.filter((_, i) => {
      const q = momentumEv[i] / REFERENCE_MOMENTUM_EV;
      return q > 0.05 && q < 1;
    });
    expect(inside).toHaveLength(38);
    for (const value of inside) expect(value > 0.85 && value < 1.05, `${value}`).toBe(true);
  });
});
