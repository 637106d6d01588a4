/** Two tables under one scenario, and tables with fewer cells. */
import { describe, expect, test } from 'vitest';
import { CrystalDescription } from '../../service/schemas/crystal.ts';
import { CrystalComparisonAnswer } from '../../service/schemas/crystal-comparisons.ts';
import { RatesAnswer } from '../../service/schemas/rates.ts';
import { inventedDarkMatter, inventedTable, type Json, largeTable } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const darkMatter = inventedDarkMatter();

async function compared(id: string, other: string, scenario: Json = { darkMatter }) {
  const response = await app.post(`/v1/crystals/${id}/comparisons`, { other, scenario });
  const text = await response.text();
  expect(response.status, text.slice(0, 300)).toBe(200);
  return CrystalComparisonAnswer.parse(JSON.parse(text));
}

async function refused(id: string, body: unknown) {
  const { errors } = await problemOf(await app.post(`/v1/crystals/${id}/comparisons`, body), 'invalid-input');
  return errors!.map(({ pointer, parameter }) => pointer ?? parameter).sort();
}

async function storedId(table: unknown): Promise<string> {
  return CrystalDescription.parse(await (await app.post('/v1/crystals', table)).json()).id;
}

const ratesOf = async (scenario: Json) => RatesAnswer.parse(await (await app.post('/v1/rates', scenario)).json());
const codesOf = ({ notices }: CrystalComparisonAnswer) => notices.map(({ code }) => code);

describe('POST /v1/crystals/{id}/comparisons', () => {
  test.each(['heavy', 'light'])(
    'POST /v1/crystals/silicon/comparisons: with silicon-unscreened, %s: the rates of POST /v1/rates, and their ratio',
    async (mediator) => {
      const scenario = { darkMatter: inventedDarkMatter({ mediator }), ionization: { maxElectrons: 12 } };
      const answer = await compared('silicon', 'silicon-unscreened', scenario);
      let bins = 0;
      for (const [side, id] of [
        ['baseline', 'silicon'],
        ['candidate', 'silicon-unscreened'],
      ] as const) {
        const rates = await ratesOf({ ...scenario, crystal: { id } });
        expect(answer.bins.map((bin) => bin[side])).toEqual(rates.bins.map(({ rate }) => rate));
        expect(answer.total[side]).toEqual(rates.total);
        expect(answer[side].id).toBe(rates.provenance.crystal!.id);
      }
      for (const { baseline, candidate, ratio } of answer.bins) {
        if (baseline.value === 0) expect(ratio).toBeNull();
        else expect(ratio).toBe(candidate.value / baseline.value);
        bins++;
      }
      expect(bins).toBe(12);
      // screening takes away most where little momentum is left to a bin
      expect(answer.bins[0].ratio!).toBeGreaterThan(1.2);
      expect(codesOf(answer)).toEqual(
        expect.arrayContaining(['planning-estimate', 'unscreened-table', 'different-screening']),
      );
    },
  );

  test('POST /v1/crystals/silicon/comparisons: blocks add up to the difference, the largest first, inside what 10 MeV can reach', async () => {
    const answer = await compared('silicon', 'silicon-unscreened');
    const { blocks, aboveGap } = answer;
    const sum = blocks.reduce((all, { difference }) => all + difference.value, 0);
    // both sides integrated to 2e-4
    const error = 4e-4 * aboveGap.candidate.value;
    expect(Math.abs(sum - (aboveGap.candidate.value - aboveGap.baseline.value))).toBeLessThan(error);
    blocks.forEach(({ share, difference, baseline, candidate, momentum, energy }, i) => {
      if (i > 0) expect(Math.abs(share)).toBeLessThanOrEqual(Math.abs(blocks[i - 1].share));
      expect(difference.value).toBeCloseTo(candidate.value - baseline.value, 10);
      expect(share * aboveGap.baseline.value).toBeCloseTo(difference.value, 6);
      expect(momentum.from).toBeLessThan(momentum.to);
      expect(energy.from).toBeGreaterThanOrEqual(1.12);
      // q ≤ 2 m v_max = 53 keV at 794 km/s
      expect(momentum.to).toBeLessThan(53);
    });
    expect(blocks.length).toBeGreaterThan(20);
    // screening acts at small momenta: most of the difference is made below 2.5 α mₑ
    const low = blocks.filter(({ momentum }) => momentum.to < 10).reduce((all, { share }) => all + share, 0);
    expect(low / blocks.reduce((all, { share }) => all + share, 0)).toBeGreaterThan(0.8);
  });

  test('POST /v1/crystals/silicon/comparisons: "in-medium" compares with the screened twin, within 3 %', async () => {
    const answer = await compared('silicon', 'silicon-unscreened', { darkMatter, screening: 'in-medium' });
    expect(answer.candidate.screened).toBe(true);
    expect(codesOf(answer)).toContain('screened-twin');
    expect(codesOf(answer)).not.toContain('different-screening');
    const ratios = answer.bins.flatMap(({ ratio }) => (ratio === null ? [] : [ratio]));
    for (const ratio of ratios) expect(Math.abs(ratio - 1)).toBeLessThan(0.03);
    expect(ratios.length).toBeGreaterThan(4);
  });

  test('POST /v1/crystals/{id}/comparisons: a table with itself has ratio 1 and no block; one twice as large has 2', async () => {
    const [first, { formFactorSquared, ...rest }] = [inventedTable(), inventedTable({ name: 'Doubled' })];
    const doubled = (formFactorSquared as number[][]).map((row) => row.map((value) => 2 * value));
    const [id, other] = [await storedId(first), await storedId({ ...rest, formFactorSquared: doubled })];
    const same = await compared(id, id);
    expect(same.blocks).toEqual([]);
    expect(same.total.ratio).toBe(1);
    const twice = await compared(id, other);
    expect(twice.total.ratio).toBeCloseTo(2, 12);
    expect(twice.aboveGap.ratio).toBeCloseTo(2, 12);
    expect(twice.blocks.reduce((all, { share }) => all + share, 0)).toBeCloseTo(1, 9);
    expect(await compared(id, other)).toEqual(twice);
  });

  test('POST /v1/crystals/{id}/comparisons: gap and pair energy are the baseline’s, and another gap is told', async () => {
    const [id, other] = [
      await storedId(inventedTable()),
      await storedId(inventedTable({ name: 'Another gap', bandGap: '1.3 eV', energyPerPair: undefined })),
    ];
    const answer = await compared(id, other);
    expect(codesOf(answer)).toContain('different-gaps');
    expect(answer.total.ratio).toBe(1);
    const back = await problemOf(
      await app.post(`/v1/crystals/${other}/comparisons`, { other: id, scenario: { darkMatter } }),
      'invalid-input',
    );
    expect(back.errors!.map(({ pointer }) => pointer)).toEqual(['/scenario/ionization/energyPerPair']);
  });

  test('POST /v1/crystals/{id}/comparisons: a mass that reaches nothing: zeros, null ratios, no block', async () => {
    const answer = await compared('silicon', 'silicon-unscreened', {
      darkMatter: inventedDarkMatter({ mass: '0.1 MeV' }),
    });
    expect(answer.bins.every(({ ratio, baseline }) => ratio === null && baseline.value === 0)).toBe(true);
    expect(answer.total.ratio).toBeNull();
    expect(answer.aboveGap.ratio).toBeNull();
    expect(answer.blocks).toEqual([]);
  });

  test('POST /v1/crystals/{id}/comparisons: an unknown table is a 404 in the URL and a 422 in the body', async () => {
    const body = { other: 'silicon', scenario: { darkMatter } };
    await problemOf(await app.post('/v1/crystals/unobtainium/comparisons', body), 'not-found');
    expect(await refused('silicon', { ...body, other: 'unobtainium' })).toEqual(['/other']);
    const unscreened = { ...body.scenario, screening: 'none' };
    expect(await refused('silicon', { other: 'unobtainium', scenario: unscreened })).toEqual([
      '/other',
      '/scenario/screening',
    ]);
  });

  test.each<[string, Json, readonly string[]]>([
    ['no scenario', { scenario: undefined }, ['/scenario']],
    ['no other', { other: undefined }, ['/other']],
    ['a crystal in the scenario', { scenario: { darkMatter, crystal: { id: 'silicon' } } }, ['/scenario/crystal']],
    [
      'a goal, which plays no part',
      { scenario: { darkMatter, goal: { kind: 'events', count: 3 } } },
      ['/scenario/goal'],
    ],
    ['no mass', { scenario: { darkMatter: { ...darkMatter, mass: undefined } } }, ['/scenario/darkMatter/mass']],
    [
      'a splitting below the gap',
      { scenario: { darkMatter: { ...darkMatter, massSplitting: '-2 eV' }, ionization: { bandGap: '1 eV' } } },
      ['/scenario/darkMatter/massSplitting'],
    ],
    [
      'a splitting below the table’s gap',
      { scenario: { darkMatter: { ...darkMatter, massSplitting: '-2 eV' } } },
      ['/scenario/darkMatter/massSplitting'],
    ],
  ])('POST /v1/crystals/{id}/comparisons: %s is refused', async (_what, over, pointers) => {
    expect(await refused('silicon', { other: 'silicon-unscreened', scenario: { darkMatter }, ...over })).toEqual(
      pointers,
    );
  });

  test('POST /v1/crystals/{id}/comparisons: a fault of a table is told where the table is named', async () => {
    const fromZero = inventedTable({
      name: 'From zero',
      bandGap: '0 eV',
      momentum: { unit: 'keV', edges: [0, 2, 4] },
    });
    const id = await storedId(fromZero);
    const scenario = { darkMatter, ionization: { bandGap: '0 eV', energyPerPair: '3.8 eV' } };
    expect(await refused(id, { other: 'silicon', scenario })).toEqual(['id']);
    const fine = await storedId(inventedTable());
    expect(await refused(fine, { other: id, scenario })).toEqual(['/other']);
  });
});

describe('POST /v1/crystals/{id}/regrids', () => {
  const regrid = (id: string, body: unknown) => app.post(`/v1/crystals/${id}/regrids`, body);

  test('POST /v1/crystals/silicon/regrids: half the cells: 201, then 200; source, sum rule and rates are those of silicon', async () => {
    const body = { momentumCells: 360, energyCells: 250 };
    const response = await regrid('silicon', body);
    expect(response.status).toBe(201);
    const half = CrystalDescription.parse(await response.json());
    expect(response.headers.get('location')).toBe(`/v1/crystals/${half.id}`);
    const silicon = CrystalDescription.parse(await (await app.get('/v1/crystals/silicon')).json());
    expect(half.source).toContain(silicon.id);
    expect(half).toMatchObject({ builtIn: false, screened: true, bandGap: { value: 1.12 }, electronsPerCell: 8 });
    expect(half.momentum).toMatchObject({ count: 361, from: 0, to: silicon.momentum.to });
    expect(half.energy.count).toBeLessThan(256);
    expect(half.quality!.verdict).toBe('fine');
    expect(half.quality!.sumRule!.electronsFound! / silicon.quality!.sumRule!.electronsFound!).toBeCloseTo(1, 2);
    expect((await regrid('silicon', body)).status).toBe(200);
    const answer = await compared('silicon', half.id);
    for (const { ratio } of answer.bins.slice(0, 5)) expect(Math.abs(ratio! - 1)).toBeLessThan(0.01);
  });

  test('POST /v1/crystals/{id}/regrids: a table that has as many cells already is itself, 200', async () => {
    const response = await regrid('silicon', { momentumCells: 720 });
    expect(response.status).toBe(200);
    expect(await response.json()).toMatchObject({ aliases: ['silicon'] });
  });

  test('POST /v1/crystals/{id}/regrids: points become cells', async () => {
    const {
      momentum: _q,
      energy: _e,
      formFactorSquared,
      ...rest
    } = largeTable(6, 6, 'Points') as Json & {
      formFactorSquared: number[][];
    };
    const points = (step: number) => ({ start: step, step, count: 6 });
    const id = await storedId({
      ...rest,
      formFactorSquared,
      momentum: { unit: 'keV', points: points(2) },
      energy: { unit: 'eV', points: points(3) },
    });
    const cells = CrystalDescription.parse(await (await regrid(id, { momentumCells: 5, energyCells: 3 })).json());
    expect(cells.momentum).toMatchObject({ kind: 'edges', count: 6, from: 2, to: 12 });
    expect(cells.energy).toMatchObject({ kind: 'edges', count: 4, from: 3, to: 18 });
  });

  test('POST /v1/crystals/{id}/regrids: a name of 200 characters stays within 200', async () => {
    const id = await storedId(largeTable(8, 8, `${'x'.repeat(185)}😀${'y'.repeat(13)}`));
    const coarse = CrystalDescription.parse(await (await regrid(id, { energyCells: 4 })).json());
    expect(coarse.name).toMatch(/^x{185}.*\(8 × [45] cells\)$/);
    expect(coarse.name.length).toBeLessThanOrEqual(200);
  });

  test.each<[string, Json, readonly string[]]>([
    ['nothing asked', {}, ['']],
    ['one cell', { momentumCells: 1 }, ['/momentumCells']],
    ['more cells than there are', { momentumCells: 721, energyCells: 501 }, ['/momentumCells', '/energyCells']],
    ['half a cell', { energyCells: 2.5 }, ['/energyCells']],
    ['a misspelt field', { energyCells: 5, cells: 5 }, ['/cells']],
  ])('POST /v1/crystals/{id}/regrids: %s is refused', async (_what, body, pointers) => {
    const { errors } = await problemOf(await regrid('silicon', body), 'invalid-input');
    expect(errors!.map(({ pointer }) => pointer)).toEqual(pointers);
  });

  test('POST /v1/crystals/{id}/regrids: an unknown table is a 404', async () => {
    await problemOf(await regrid('unobtainium', { energyCells: 5 }), 'not-found');
  });
});
