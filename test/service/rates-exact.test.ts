import { describe, expect, it } from 'vitest';
import * as constants from '../../physics/constants.ts';
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { columnsOf, rowsOf } from '../../physics/crystal/crystal-table.ts';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import { gaussianTable, ridgeTable } from '../support/exact-tables.ts';
import type { Json } from '../support/invented.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();

/** The table as a caller posts it. */
function posted(table: CrystalTable, over: Json): Json {
  const [rows, columns] = [rowsOf(table), columnsOf(table)];
  return {
    name: 'Known in closed form',
    cellMass: '52.32 GeV',
    momentum: { unit: 'eV', edges: [...table.momentumEv] },
    energy: { unit: 'eV', edges: [...table.energyEv] },
    formFactorSquared: Array.from({ length: rows }, (_, i) => [
      ...table.values.subarray(i * columns, (i + 1) * columns),
    ]),
    ...over,
  };
}

async function rates(scenario: Json): Promise<RatesAnswer> {
  const response = await app.post('/v1/rates', scenario);
  const text = await response.text();
  expect(response.status, text.slice(0, 300)).toBe(200);
  return JSON.parse(text) as RatesAnswer;
}

/** n_χ σ̄ₑ c · yr for each cell of a kilogram, 1/(kg yr). */
function perCell(massEv: number): number {
  const cellKg = (52.32e9 * constants.ELECTRONVOLT_J) / (constants.SPEED_OF_LIGHT_KM_PER_S * 1e3) ** 2;
  return ((0.3e9 / massEv) * 1e-37 * constants.SPEED_OF_LIGHT_KM_PER_S * 1e5 * constants.YEAR_S) / cellKg;
}

describe('POST /v1/rates: checks with an exact answer', () => {
  it('eight free electrons scatter at the rate n σ ⟨v⟩, ⟨v⟩ = 353.731 km/s, whatever the mass (Essig et al., PRD 85, 076007 (2012))', async () => {
    for (const massMev of [5, 50]) {
      const { total } = await rates({
        darkMatter: { mass: `${massMev} MeV`, referenceCrossSection: '1e-37 cm^2', mediator: 'heavy' },
        crystal: posted(ridgeTable(massMev * 1e6, 794, 500), { bandGap: '0 eV', energyPerPair: '1 eV' }),
        ionization: { maxElectrons: 100 },
      });
      const expected = (perCell(massMev * 1e6) * 8 * 353.731) / constants.SPEED_OF_LIGHT_KM_PER_S;
      // 500 cells: 9 times the second-order error of the 1500 in the core's own test, 3e-5
      expect(Math.abs(total.value / expected - 1), `${massMev} MeV`).toBeLessThan(2.7e-4);
    }
  });

  it('|f|² = K q² at v_E = 0, v_esc → ∞ gives C · 2 K m_χ exp(−2E/(m_χ v₀²)), heavy, and light with (q/α mₑ)⁴ (Gradshteyn & Ryzhik 3.325)', async () => {
    const m = 1e7;
    const thermal = (m * (238 / constants.SPEED_OF_LIGHT_KM_PER_S) ** 2) / 2;
    const mu = (m * constants.ELECTRON_MASS_EV) / (m + constants.ELECTRON_MASS_EV);
    const c = perCell(m) * constants.FINE_STRUCTURE * (constants.ELECTRON_MASS_EV / mu) ** 2;
    for (const mediator of ['heavy', 'light'] as const) {
      const { bins } = await rates({
        darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-37 cm^2', mediator },
        halo: { laboratorySpeed: '0 km/s', escapeSpeed: '8000 km/s' },
        crystal: posted(gaussianTable(mediator, 4000), { bandGap: '1 eV', energyPerPair: '2 eV' }),
        ionization: { maxElectrons: 6 },
      });
      for (const { energy, rate } of bins) {
        const expected = c * 2e-8 * m * thermal * (Math.exp(-energy.from / thermal) - Math.exp(-energy.to / thermal));
        // rows 0.25 % wide: f ∝ q⁶ against φ ∝ q⁻⁵ taken constant in them is 30 × 0.0025²/12 off
        expect(Math.abs(rate.value / expected - 1), `${mediator}, ${energy.from} eV`).toBeLessThan(
          mediator === 'heavy' ? 5e-6 : 3e-5,
        );
      }
    }
  });
});
