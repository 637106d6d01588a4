import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import * as constants from '../../../physics/constants.ts';
import type { CrystalTable } from '../../../physics/crystal/crystal-table.ts';
import { meanSpeedKmPerS } from '../../../physics/halo/mean-speed.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import { crystalRate, type RateScenario } from '../../../physics/rate/crystal-rate.ts';
import builtIn from '../../fixtures/built-in-rates.json' with { type: 'json' };
import { builtInTable } from '../../support/built-in-table.ts';
import { gaussianTable, ridgeTable } from '../../support/exact-tables.ts';
import { referenceTable } from '../../support/reference-table.ts';

const halo = standardHalo({
  circularSpeedKmPerS: 238,
  escapeSpeedKmPerS: 544,
  laboratorySpeedKmPerS: 250,
  cutoff: 'sharp',
});

function scenario(change: Partial<RateScenario> = {}): RateScenario {
  return {
    massEv: 1e7,
    crossSectionCm2: 1e-37,
    mediator: { kind: 'heavy' },
    splittingEv: 0,
    localDensityGevPerCm3: 0.3,
    halo,
    table: referenceTable('T1'),
    ionization: stepIonization(1.12, 3.8),
    energyPerPairEv: 3.8,
    maxElectrons: 8,
    ...change,
  };
}

/** (ρ/m_χ)(1/M_cell) σ̄ₑ c · yr in 1/(kg yr), written out anew from the constants. */
function prefactor(s: RateScenario): number {
  const cellKg = (s.table.cellMassEv * constants.ELECTRONVOLT_J) / (constants.SPEED_OF_LIGHT_KM_PER_S * 1e3) ** 2;
  return (
    (((s.localDensityGevPerCm3 * 1e9) / s.massEv) *
      s.crossSectionCm2 *
      constants.SPEED_OF_LIGHT_KM_PER_S *
      1e5 *
      constants.YEAR_S) /
    cellKg
  );
}

describe('crystalRate: checks with an exact answer', () => {
  it('free electrons at rest scatter at the rate n σ ⟨v⟩ whatever the mass (|f|² = N q³ δ(E − q²/2mₑ)/(2 α mₑ²), Essig et al. 2012)', () => {
    for (const massMev of [0.5, 5, 50, 500]) {
      const s = scenario({
        massEv: massMev * 1e6,
        table: ridgeTable(massMev * 1e6, halo.largestSpeedKmPerS, 1500),
        ionization: stepIonization(0, 1),
        energyPerPairEv: 1,
        maxElectrons: 100,
      });
      const { total } = crystalRate(s);
      const expected = (prefactor(s) * 8 * meanSpeedKmPerS(halo)) / constants.SPEED_OF_LIGHT_KM_PER_S;
      // cells of 1/1500 of the range leave an error of second order in the cell (a quarter of it with 3000), the first one is missing
      expect(Math.abs(total.value / expected - 1), `${massMev} MeV: ${total.value}, expected ${expected}`).toBeLessThan(
        3e-5,
      );
    }
  });

  it('|f|² = K q² at v_E = 0, v_esc → ∞ gives C · 2 K m_χ exp(−2E/(m_χ v₀²)) (Gradshteyn & Ryzhik 3.325), heavy, and light with (q/α mₑ)⁴', () => {
    const v0 = 238;
    const atRest = standardHalo({
      circularSpeedKmPerS: v0,
      escapeSpeedKmPerS: 8000,
      laboratorySpeedKmPerS: 0,
      cutoff: 'sharp',
    });
    const m = 1e7;
    const thermal = (m * (v0 / constants.SPEED_OF_LIGHT_KM_PER_S) ** 2) / 2; // eV
    for (const mediator of ['heavy', 'light'] as const) {
      const s = scenario({
        massEv: m,
        mediator: { kind: mediator },
        halo: atRest,
        table: gaussianTable(mediator, 4000),
        ionization: stepIonization(1, 2),
        energyPerPairEv: 2,
        maxElectrons: 6,
      });
      const { bins } = crystalRate(s);
      // 2/(√π v₀) ∫ dq exp(−(E/q + q/2m)²/v₀²) = 2 m e^{−2E/(m v₀²)}, c put back
      const mu = (m * constants.ELECTRON_MASS_EV) / (m + constants.ELECTRON_MASS_EV);
      const c = prefactor(s) * constants.FINE_STRUCTURE * (constants.ELECTRON_MASS_EV / mu) ** 2;
      for (const { fromEv, toEv, rate } of bins) {
        const expected = c * 2e-8 * m * thermal * (Math.exp(-fromEv / thermal) - Math.exp(-toEv / thermal));
        // rows 0.25 % wide: f ∝ q⁶ against φ ∝ q⁻⁵ taken constant in them is 30 × 0.0025²/12 off
        expect(Math.abs(rate.value / expected - 1), `${mediator}, ${fromEv} eV`).toBeLessThan(
          mediator === 'heavy' ? 5e-6 : 3e-5,
        );
      }
    }
  });

  it('m_χ → ∞ leaves v_min = E/q: the rate times the mass no longer depends on it', () => {
    const [a, b] = [1e16, 1e18].map((massEv) => crystalRate(scenario({ massEv })).total.value * massEv);
    expect(a / b).toBeCloseTo(1, 6);
  });
});

describe('crystalRate: the built-in tables against an independent integration (fixtures/built-in-rates.json)', () => {
  it.each(['silicon', 'germanium', 'diamond', 'gallium-arsenide'])(
    '%s, screened and not, to 1e-3; 1e-5 achieved',
    (crystal) => {
      const cases = builtIn.rates.filter((r) => r.crystal === crystal);
      expect(cases).toHaveLength(16);
      for (const r of cases) {
        const { table, bandGapEv, energyPerPairEv } = builtInTable(crystal, r.screened);
        const { bins, total } = crystalRate(
          scenario({
            massEv: parseFloat(r.mass) * 1e6,
            mediator: { kind: r.mediator as 'heavy' | 'light' },
            table,
            ionization: stepIonization(bandGapEv, energyPerPairEv),
            energyPerPairEv,
            maxElectrons: 12,
          }),
        );
        r.bins.forEach((expected, i) => {
          const { value, relativeError } = bins[i].rate;
          if (expected === 0) expect(value).toBe(0);
          else
            expect(
              Math.abs(value / expected - 1),
              `${r.mass} ${r.mediator} n ${i + 1}: ${value} ± ${relativeError}`,
            ).toBeLessThan(1e-5);
        });
        if (r.total > 0) expect(total.value / r.total).toBeCloseTo(1, 5);
      }
    },
  );
});

describe('crystalRate: laws', () => {
  it('is linear in σ̄ₑ and ρ and in 1/M_cell', () => {
    const base = crystalRate(scenario());
    const law = fc.property(fc.double({ min: 1e-3, max: 1e3, noNaN: true }), (k) => {
      const changed = [
        crystalRate(scenario({ crossSectionCm2: 1e-37 * k })),
        crystalRate(scenario({ localDensityGevPerCm3: 0.3 * k })),
        crystalRate(scenario({ table: { ...referenceTable('T1'), cellMassEv: 52.32e9 / k } })),
      ];
      for (const { bins } of changed)
        bins.forEach(({ rate }, i) =>
          expect(rate.value).toBeCloseTo(base.bins[i].rate.value * k, 8 - Math.round(Math.log10(1 + rate.value))),
        );
    });
    fc.assert(law, { numRuns: 20 });
  });

  it('adds up: bins to the total, finer bins to coarser ones, the spectrum to the bins and the overflow', () => {
    for (const name of ['T1', 'T2', 'T4', 'T7']) {
      const table = referenceTable(name);
      const coarse = crystalRate(scenario({ table, massEv: 3e7 }), true);
      const fine = crystalRate(
        scenario({ table, massEv: 3e7, energyPerPairEv: 1.9, ionization: stepIonization(1.12, 1.9), maxElectrons: 16 }),
      );
      expect(coarse.total.value).toBeCloseTo(
        coarse.bins.reduce((sum, { rate }) => sum + rate.value, 0),
        9,
      );
      coarse.bins.forEach(({ rate }, i) => {
        const halves = fine.bins[2 * i].rate.value + fine.bins[2 * i + 1].rate.value;
        expect(Math.abs(halves - rate.value)).toBeLessThanOrEqual(1e-5 * rate.value);
      });
      const { energyEv, values } = coarse.spectrum!;
      const integral = values.reduce((sum, value, i) => sum + value * (energyEv[i + 1] - energyEv[i]), 0);
      expect(integral / (coarse.total.value + coarse.overflow.value)).toBeCloseTo(1, 12);
    }
  });

  it('has the light mediator as the limit of a small mass, the heavy one of a large mass', () => {
    for (const [kind, massEv] of [
      ['light', 1e-3],
      ['heavy', 1e12],
    ] as const) {
      const limit = crystalRate(scenario({ mediator: { kind } }));
      const near = crystalRate(scenario({ mediator: { kind: 'massive', massEv } }));
      near.bins.forEach(({ rate }, i) =>
        expect(Math.abs(rate.value - limit.bins[i].rate.value)).toBeLessThanOrEqual(1e-5 * limit.bins[i].rate.value),
      );
    }
  });

  it('does not change when the cells of a table are split', () => {
    const table = referenceTable('T1');
    const split = splitCells(table);
    for (const massEv of [2e6, 1e7, 1e8]) {
      for (const kind of ['heavy', 'light'] as const) {
        const whole = crystalRate(scenario({ massEv, mediator: { kind } }));
        const parts = crystalRate(scenario({ massEv, mediator: { kind }, table: split }));
        parts.bins.forEach(({ rate }, i) => {
          const tolerance = (rate.relativeError + whole.bins[i].rate.relativeError) * rate.value;
          expect(Math.abs(rate.value - whole.bins[i].rate.value)).toBeLessThanOrEqual(tolerance);
        });
      }
    }
  });

  it('treats a loss function as the |f|² that it is worth at each momentum: V q⁵ L/(8π² α² mₑ²)', () => {
    // rows so fine that the conversion is constant in each
    const rows = 3000;
    const momentumEv = Float64Array.from({ length: rows + 1 }, (_, i) => 1e3 * 60 ** (i / rows));
    const energyEv = Float64Array.from([1, 5, 9, 13]);
    const loss = Float64Array.from({ length: rows * 3 }, (_, i) => 1 / (1 + (i % 3)));
    const volume = 40 / constants.HBAR_C_EV_ANGSTROM ** 3;
    const factor = volume / (8 * Math.PI ** 2 * constants.FINE_STRUCTURE ** 2 * constants.ELECTRON_MASS_EV ** 2);
    const mean = (i: number): number =>
      (momentumEv[i + 1] ** 6 - momentumEv[i] ** 6) / (6 * (momentumEv[i + 1] - momentumEv[i]));
    const base = { axes: 'edges' as const, momentumEv, energyEv, cellMassEv: 52.32e9, cellVolumeAngstrom3: 40 };
    const asLoss = crystalRate(scenario({ table: { ...base, quantity: 'lossFunction', values: loss } }));
    const asForm = crystalRate(
      scenario({
        table: {
          ...base,
          quantity: 'formFactorSquared',
          values: loss.map((value, i) => value * factor * mean(Math.floor(i / 3))),
        },
      }),
    );
    expect(asLoss.total.value / asForm.total.value).toBeCloseTo(1, 5);
  });
});

describe('crystalRate: edges of reach', () => {
  it('gives bins out of reach exactly 0, and the smallest mass that reaches the gap', () => {
    const vMax = halo.largestSpeedKmPerS / constants.SPEED_OF_LIGHT_KM_PER_S;
    const threshold = (2 * 1.12) / vMax ** 2;
    for (const [factor, reached] of [
      [0.5, false],
      [0.999999, false],
      [1, false],
      [1.000001, true],
      [1.001, true],
    ] as const) {
      const { bins, total, smallestMassEv } = crystalRate(scenario({ massEv: threshold * factor }));
      expect(smallestMassEv / threshold).toBeCloseTo(1, 14);
      expect(total.value > 0, `${factor} of the threshold mass`).toBe(reached);
      for (const bin of bins.slice(1)) expect(bin.rate).toEqual({ value: 0, relativeError: 0 });
    }
  });

  it('says where the table ends inside what the kinematics allow, with the share of the rate next to that end', () => {
    const { rangeCuts } = crystalRate(scenario({ massEv: 1e9 }));
    expect(rangeCuts.map(({ axis, end }) => `${axis} ${end}`)).toEqual(['energy upper', 'momentum upper']);
    for (const { tableEv, kinematicEv, edgeShare } of rangeCuts) {
      expect(kinematicEv).toBeGreaterThan(tableEv);
      expect(edgeShare).toBeGreaterThan(0);
      expect(edgeShare).toBeLessThan(0.2);
    }
    expect(crystalRate(scenario({ massEv: 2e6, table: referenceTable('T3') })).rangeCuts).toEqual([]);
  });

  it('refuses a momentum axis from 0 where the energy can vanish, and a splitting below minus the gap', () => {
    const zero = { ...referenceTable('T3'), energyEv: referenceTable('T3').energyEv };
    expect(zero.momentumEv[0]).toBe(0);
    expect(() => crystalRate(scenario({ table: zero, ionization: stepIonization(0, 1) }))).toThrow(/momentum/);
    expect(() => crystalRate(scenario({ splittingEv: -1.12 }))).toThrow(/massSplitting/);
  });
});

/** Every cell in four parts of the same value. */
function splitCells(table: CrystalTable): CrystalTable {
  const halve = (axis: Float64Array): Float64Array =>
    Float64Array.from({ length: 2 * axis.length - 1 }, (_, i) =>
      i % 2 === 0 ? axis[i / 2] : (axis[(i - 1) / 2] + axis[(i + 1) / 2]) / 2,
    );
  const columns = table.energyEv.length - 1;
  const rows = table.momentumEv.length - 1;
  const values = Float64Array.from({ length: 4 * rows * columns }, (_, k) => {
    const [i, j] = [Math.floor(k / (2 * columns)), k % (2 * columns)];
    return table.values[Math.floor(i / 2) * columns + Math.floor(j / 2)];
  });
  return { ...table, momentumEv: halve(table.momentumEv), energyEv: halve(table.energyEv), values };
}
