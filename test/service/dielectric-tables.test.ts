/** Tables of a complex dielectric function: stored as they are, used as loss function or as Im ε. */
import { describe, expect, test } from 'vitest';
import { contentOf, idOf, recordOf } from '../../service/crystals/crystal-record.ts';
import { CrystalDescription, type CrystalHeader, CrystalValues } from '../../service/schemas/crystal.ts';
import { RatesAnswer } from '../../service/schemas/rates.ts';
import { oscillator } from '../support/dielectric-models.ts';
import { changedAt, inventedDarkMatter, inventedTable, type Json } from '../support/invented.ts';
import { pointersOf, problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
/** Silicon's electrons as one oscillator: ω_p = 16.6 eV at 4.8 eV, 4 eV wide; ε(0) = 1 + (16.6/4.8)² = 12.96. */
const model = oscillator(16.6, 4.8, 4);
const [ROWS, COLUMNS] = [40, 160];
const energyOf = (j: number): number => (j + 0.5) * 0.5;
const matrixOf = (numberAt: (energyEv: number) => number): number[][] =>
  Array.from({ length: ROWS }, () => Array.from({ length: COLUMNS }, (_, j) => numberAt(energyOf(j))));

const { formFactorSquared: _, ...invented } = inventedTable();
const common: Json = {
  ...invented,
  cellVolume: '40 angstrom^3',
  electronsPerCell: 8,
  momentum: { unit: 'keV', edges: { start: 0, step: 0.2, count: ROWS + 1 } },
  energy: { unit: 'eV', edges: { start: 0, step: 0.5, count: COLUMNS + 1 } },
};
const epsilon: Json = {
  ...common,
  dielectricFunction: { real: matrixOf(model.real), imaginary: matrixOf(model.imaginary) },
};

async function stored(table: unknown) {
  const response = await app.post('/v1/crystals', table);
  const text = await response.text();
  expect([200, 201], text.slice(0, 300)).toContain(response.status);
  return CrystalDescription.parse(JSON.parse(text));
}

async function ratesOf(crystal: unknown, screening: string): Promise<RatesAnswer> {
  const scenario = { darkMatter: inventedDarkMatter(), crystal, screening, ionization: { maxElectrons: 8 } };
  const response = await app.post('/v1/rates', scenario);
  const text = await response.text();
  expect(response.status, text.slice(0, 300)).toBe(200);
  return RatesAnswer.parse(JSON.parse(text));
}

describe('POST /v1/crystals: a dielectric function', () => {
  test('POST /v1/crystals: a dielectric function is screened as given, and its report knows ε(0) and the plasmon', async () => {
    const description = await stored(epsilon);
    expect(description).toMatchObject({ quantity: 'dielectricFunction', screened: true });
    const { staticDielectric, plasmon } = description.quality!.opticalLimit!;
    // cells of 0.5 eV, and 3 % of the strength above 80 eV
    expect(Math.abs(staticDielectric!.value / (1 + (16.6 / 4.8) ** 2) - 1)).toBeLessThan(0.05);
    expect(Math.abs(plasmon!.value - model.plasmonEv)).toBeLessThan(0.6);
  });

  test('POST /v1/rates: as given the rates are those of Im[−1/ε], with "none" those of Im ε, stored and inline', async () => {
    const { id } = await stored(epsilon);
    const loss = await ratesOf({ ...common, lossFunction: matrixOf(model.loss) }, 'as-given');
    for (const screening of ['as-given', 'in-medium']) {
      for (const crystal of [{ id }, epsilon]) {
        const screened = await ratesOf(crystal, screening);
        screened.bins.forEach(({ rate }, n) => {
          const expected = loss.bins[n].rate.value;
          expect(Math.abs(rate.value - expected)).toBeLessThanOrEqual(1e-9 * expected); // the model’s loss and Im ε/|ε|² round apart
        });
        expect(screened.total.value).toBeGreaterThan(0);
        expect(screened.notices.map(({ code }) => code)).not.toContain('unscreened-table');
      }
    }
    const imaginary = await ratesOf({ ...common, lossFunction: matrixOf(model.imaginary) }, 'as-given');
    const bare = await ratesOf({ id }, 'none');
    // Im ε in the place of a loss function has the same formula
    expect(bare.bins).toEqual(imaginary.bins);
    expect(bare.notices.map(({ code }) => code)).toContain('unscreened-table');
    expect(bare.provenance.crystal).toEqual({ id });
    expect((await ratesOf({ id }, 'as-given')).total.value).toBeLessThan(bare.total.value);
  });

  test('GET /v1/crystals/{id}/values: downloaded and posted again it is the same table, in JSON only', async () => {
    const { id } = await stored(epsilon);
    const response = await app.get(`/v1/crystals/${id}/values`);
    const text = await response.text();
    expect(CrystalValues.parse(JSON.parse(text)).dielectricFunction).toEqual(epsilon['dielectricFunction']);
    expect((await stored(text)).id).toBe(id);
    await problemOf(await app.get(`/v1/crystals/${id}/values`, { accept: 'text/csv' }), 'not-acceptable');
  });

  test('POST /v1/crystals/{id}/comparisons and regrids: compared like any other, but not merged', async () => {
    const { id } = await stored(epsilon);
    const { id: other } = await stored({ ...common, lossFunction: matrixOf(model.loss) });
    const body = { other, scenario: { darkMatter: inventedDarkMatter() } };
    const answer = (await (await app.post(`/v1/crystals/${id}/comparisons`, body)).json()) as {
      total: { ratio: number };
    };
    expect(answer.total.ratio).toBeCloseTo(1, 9);
    const { errors } = await problemOf(
      await app.post(`/v1/crystals/${id}/regrids`, { energyCells: 20 }),
      'invalid-input',
    );
    expect(errors![0]).toMatchObject({ parameter: 'id', detail: expect.stringContaining('mean') });
  });

  test.each<[string, string, unknown, readonly string[]]>([
    ['no volume', '/cellVolume', undefined, ['/cellVolume']],
    ['no real part', '/dielectricFunction/real', undefined, ['/dielectricFunction/real']],
    ['a third part', '/dielectricFunction/third', [[1]], ['/dielectricFunction/third']],
    ['a negative imaginary part', '/dielectricFunction/imaginary/1/2', -1, ['/dielectricFunction/imaginary/1/2']],
    ['a real part that is text', '/dielectricFunction/real/0/0', '1', ['/dielectricFunction/real/0/0']],
    ['a short row', '/dielectricFunction/real/3', [1, 2], ['/dielectricFunction/real/3']],
    ['another quantity beside it', '/lossFunction', matrixOf(model.loss), ['']],
    ['parts that are none', '/dielectricFunction', 5, ['/dielectricFunction']],
  ])('POST /v1/crystals: a dielectric function with %s is refused', async (_what, pointer, changed, pointers) => {
    expect(await pointersOf(await app.post('/v1/crystals', changedAt(epsilon, pointer, changed)))).toEqual(pointers);
  });

  test('POST /v1/crystals: an ε whose Im[−1/ε] is beyond all numbers is refused where it is', async () => {
    const table = changedAt(
      changedAt(epsilon, '/dielectricFunction/real/2/7', 0),
      '/dielectricFunction/imaginary/2/7',
      5e-324,
    );
    expect(await pointersOf(await app.post('/v1/crystals', table))).toEqual(['/dielectricFunction/imaginary/2/7']);
  });

  test('recordOf: the stored content of a dielectric function is read back whole, and refused when half of it is missing', async () => {
    const response = await app.post('/v1/crystals', epsilon);
    const { id } = CrystalDescription.parse(await response.json());
    const axis = (step: number, count: number) => Array.from({ length: count }, (_, i) => i * step);
    const parts = ['real', 'imaginary'].map(
      (part) => (epsilon['dielectricFunction'] as Record<string, number[][]>)[part],
    );
    const values = Float64Array.from(parts.flat(2));
    const header: CrystalHeader = {
      name: 'Invented numbers',
      screened: true,
      quantity: 'dielectricFunction',
      axes: 'edges',
      cellMassGev: 52.32,
      cellVolumeAngstrom3: 40,
      electronsPerCell: 8,
      bandGapEv: 1.12,
      energyPerPairEv: 3.8,
      momentumKev: axis(0.2, ROWS + 1),
      energyEv: axis(0.5, COLUMNS + 1),
    };
    const content = Buffer.concat([...contentOf(header, values)]);
    expect(idOf([content])).toBe(id);
    expect(recordOf(id, content).values).toEqual(new Float64Array(values));
    const half = content.subarray(0, content.length - 8 * ROWS * COLUMNS);
    expect(() => recordOf(idOf([half]), half)).toThrow(/axes/);
  });
});
