import { describe, expect, test } from 'vitest';
import { CrystalDescription, CrystalList, CrystalValues } from '../../service/schemas/crystal.ts';
import { inProcessCompute } from '../support/in-process-compute.ts';
import { changedAt, inventedScenario, inventedTable, type Json } from '../support/invented.ts';
import { pointersOf, problemOf } from '../support/problem-of.ts';
import { type TestApp, testApp } from '../support/test-app.ts';

const ID = /^[0-9a-f]{64}$/;
const app = testApp();
const store = (body: unknown) => app.post('/v1/crystals', body);
const refusedAt = async (body: unknown) => pointersOf(await store(body));

async function stored(body: unknown, at: TestApp = app) {
  const response = await at.post('/v1/crystals', body);
  const text = await response.text();
  expect([200, 201], text.slice(0, 400)).toContain(response.status);
  return CrystalDescription.parse(JSON.parse(text));
}

describe('POST /v1/crystals', () => {
  test('POST /v1/crystals: 201 with a Location, then 200 with the same id and bytes', async () => {
    const fresh = testApp();
    const first = await fresh.post('/v1/crystals', inventedTable());
    const description = await first.text();
    const { id } = CrystalDescription.parse(JSON.parse(description));
    expect(first.status).toBe(201);
    expect(id).toMatch(ID);
    expect(first.headers.get('location')).toBe(`/v1/crystals/${id}`);
    const again = await fresh.post('/v1/crystals', inventedTable());
    expect(again.status).toBe(200);
    expect(again.headers.get('location')).toBe(`/v1/crystals/${id}`);
    expect(await again.text()).toBe(description);
  });

  test('POST /v1/crystals: the description says what was sent, in fixed units', async () => {
    const table = inventedTable({
      source: 'Made up',
      cellVolume: '0.04 nm^3',
      electronsPerCell: 8,
      momentum: { unit: 'MeV', edges: [0.001, 0.002, 0.004] },
      energy: { unit: 'meV', edges: { start: 0, step: 4000, count: 4 } },
    });
    expect(await stored(table)).toMatchObject({
      aliases: [],
      builtIn: false,
      name: 'Invented numbers',
      source: 'Made up',
      quantity: 'formFactorSquared',
      screened: false,
      cellMass: { value: 52.32, unit: 'GeV' },
      cellVolume: { value: 40, unit: 'angstrom^3' },
      electronsPerCell: 8,
      bandGap: { value: 1.12, unit: 'eV' },
      energyPerPair: { value: 3.8, unit: 'eV' },
      momentum: { unit: 'keV', kind: 'edges', count: 3, from: 1, to: 4 },
      energy: { unit: 'eV', kind: 'edges', count: 4, from: 0, to: 12 },
    });
  });

  test.each<[string, Json]>([
    ['the default of screened', { screened: false }],
    ['another unit of mass', { cellMass: '52320 MeV' }],
    ['a quantity as an object', { bandGap: { value: 1120, unit: 'meV' } }],
    ['a step instead of a list', { energy: { unit: 'eV', edges: { start: 0, step: 4, count: 4 } } }],
    ['another unit of energy', { energy: { unit: 'keV', edges: [0, 0.004, 0.008, 0.012] } }],
    ['the fields in another order', Object.fromEntries(Object.entries(inventedTable()).reverse())],
  ])('POST /v1/crystals: %s is the same table', async (_what, over) => {
    expect((await stored(inventedTable(over))).id).toBe((await stored(inventedTable())).id);
  });

  test('POST /v1/crystals: −0 is 0, and the same table', async () => {
    const text = JSON.stringify(inventedTable());
    expect(text).toContain('[0,0.3');
    expect((await stored(text.replace('[0,0.3', '[-0,0.3').replace('"edges":[0,', '"edges":[-0,'))).id).toBe(
      (await stored(text)).id,
    );
  });

  test.each<[string, Json]>([
    ['another name', { name: 'Other invented numbers' }],
    ['another source', { source: 'Another' }],
    ['screened', { screened: true }],
    ['another mass', { cellMass: '52.33 GeV' }],
    ['a volume', { cellVolume: '40 angstrom^3' }],
    [
      'another number',
      {
        formFactorSquared: [
          [0.1, 0.2, 0.1],
          [0, 0.3, 0.20000000000000004],
        ],
      },
    ],
  ])('POST /v1/crystals: %s makes another table', async (_what, over) => {
    expect((await stored(inventedTable(over))).id).not.toBe((await stored(inventedTable())).id);
  });

  test.each<[string, number]>([
    // standard atomic weights (IUPAC 2021) times u = 0.93149410372 GeV (CODATA 2022)
    ['Si2', 2 * 28.085],
    ['GaAs', 69.723 + 74.922],
    ['Ge2', 2 * 72.63],
    ['C2', 2 * 12.011],
    ['NaI', 22.99 + 126.9],
    ['Al2O3', 2 * 26.982 + 3 * 15.999],
  ])('POST /v1/crystals: cellMass {"formula": "%s"}', async (formula, weight) => {
    const { cellMass } = await stored(inventedTable({ cellMass: { formula } }));
    expect(cellMass.unit).toBe('GeV');
    expect(cellMass.value / (weight * 0.93149410372)).toBeCloseTo(1, 7);
  });

  test('POST /v1/crystals: a loss function at points needs the volume and is screened by nature', async () => {
    const lossFunction = [
      [0.1, 0.2],
      [0.3, 0.4],
    ];
    const axes = { momentum: { unit: 'keV', points: [1, 2] }, energy: { unit: 'eV', points: [2, 8] } };
    const table = inventedTable({ ...axes, formFactorSquared: undefined, lossFunction });
    expect(await refusedAt(table)).toEqual(['/cellVolume']);
    const description = await stored({ ...table, cellVolume: '40 angstrom^3' });
    expect(description).toMatchObject({
      quantity: 'lossFunction',
      screened: true,
      momentum: { kind: 'points', count: 2 },
    });
  });

  const matrix = (rows: number, columns: number): number[][] =>
    Array.from({ length: rows }, () => Array(columns).fill(1));
  test.each<[string, Json, readonly string[]]>([
    ['no name', { name: undefined }, ['/name']],
    ['an empty name', { name: '' }, ['/name']],
    ['a name of 5,000 characters', { name: 'x'.repeat(5000) }, ['/name']],
    ['half a surrogate pair', { name: 'half \ud800', source: '\udfff' }, ['/name', '/source']],
    ['no cell mass', { cellMass: undefined }, ['/cellMass']],
    ['a cell mass without a unit', { cellMass: 52.32 }, ['/cellMass']],
    ['an element that is none', { cellMass: { formula: 'Xx2' } }, ['/cellMass/formula']],
    ['an element without a weight', { cellMass: { formula: 'Tc' } }, ['/cellMass/formula']],
    ['a formula with brackets', { cellMass: { formula: 'Ca(OH)2' } }, ['/cellMass/formula']],
    ['a formula that counts nothing', { cellMass: { formula: 'Si0' } }, ['/cellMass/formula']],
    ['a formula of 5,000 characters', { cellMass: { formula: 'Si'.repeat(2500) } }, ['/cellMass/formula']],
    ['no quantity', { formFactorSquared: undefined }, ['']],
    ['two quantities', { cellVolume: '40 angstrom^3', lossFunction: matrix(2, 3) }, ['']],
    ['no momentum axis', { momentum: undefined }, ['/momentum']],
    ['no energy axis', { energy: undefined }, ['/energy']],
    ['an axis that is a list', { momentum: [1, 2, 4] }, ['/momentum']],
    ['edges and points', { momentum: { unit: 'keV', edges: [1, 2, 4], points: [1, 2] } }, ['/momentum']],
    ['neither edges nor points', { momentum: { unit: 'keV' } }, ['/momentum']],
    ['axes of two kinds', { energy: { unit: 'eV', points: [1, 2, 3] } }, ['/energy']],
    ['an axis without a unit', { energy: { edges: [0, 4, 8, 12] } }, ['/energy/unit']],
    ['an axis in the wrong unit', { energy: { unit: 'kg', edges: [0, 4, 8, 12] } }, ['/energy/unit']],
    ['a descending axis', { energy: { unit: 'eV', edges: [0, 8, 4, 12] } }, ['/energy/edges/2']],
    ['an axis that stands still', { energy: { unit: 'eV', edges: [0, 4, 4, 12] } }, ['/energy/edges/2']],
    ['a negative axis', { momentum: { unit: 'keV', edges: [-1, 2, 4] } }, ['/momentum/edges/0']],
    ['an axis with a text', { momentum: { unit: 'keV', edges: [1, '2', 4] } }, ['/momentum/edges/1']],
    ['an axis with null', { momentum: { unit: 'keV', edges: [1, null, 4] } }, ['/momentum/edges/1']],
    ['an axis beyond all numbers', { momentum: { unit: 'GeV', edges: [1, 2, 1e305] } }, ['/momentum/edges/2']],
    ['an axis below all numbers', { energy: { unit: 'meV', edges: [0, 4e-323, 1, 2] } }, ['/energy/edges/1']],
    ['a step of 0', { energy: { unit: 'eV', edges: { start: 0, step: 0, count: 4 } } }, ['/energy/edges/step']],
    ['a step that is lost', { energy: { unit: 'eV', edges: { start: 1e20, step: 1, count: 4 } } }, ['/energy/edges']],
    [
      'a step out of all numbers',
      { energy: { unit: 'eV', edges: { start: 0, step: 1e308, count: 4 } } },
      ['/energy/edges'],
    ],
    ['a billion edges', { energy: { unit: 'eV', edges: { start: 0, step: 1, count: 1e9 } } }, ['/energy/edges/count']],
    ['a negative start', { energy: { unit: 'eV', edges: { start: -1, step: 4, count: 4 } } }, ['/energy/edges/start']],
    ['too few momenta', { momentum: { unit: 'keV', edges: [1, 2] }, formFactorSquared: matrix(1, 3) }, ['/momentum']],
    ['too few energies', { energy: { unit: 'eV', edges: [0, 4] }, formFactorSquared: matrix(2, 1) }, ['/energy']],
    ['a row too few', { formFactorSquared: matrix(1, 3) }, ['/formFactorSquared']],
    ['a row too many', { formFactorSquared: matrix(3, 3) }, ['/formFactorSquared']],
    ['no rows', { formFactorSquared: [] }, ['/formFactorSquared']],
    [
      'a ragged row',
      {
        formFactorSquared: [
          [1, 2, 3],
          [1, 2],
        ],
      },
      ['/formFactorSquared/1'],
    ],
    [
      'columns of the wrong number',
      { formFactorSquared: matrix(2, 4) },
      ['/formFactorSquared/0', '/formFactorSquared/1'],
    ],
    ['rows that are none', { formFactorSquared: [[1, 2, 3], 5] }, ['/formFactorSquared/1']],
    ['values that are none', { formFactorSquared: 5 }, ['/formFactorSquared']],
    ['values that pretend to be read', { formFactorSquared: { packed: true, values: [] } }, ['/formFactorSquared']],
    [
      'a negative value',
      {
        formFactorSquared: [
          [1, 2, 3],
          [1, -2, 3],
        ],
      },
      ['/formFactorSquared/1/1'],
    ],
    [
      'values that are no numbers',
      {
        formFactorSquared: [
          ['1', null, 3],
          [true, [], {}],
        ],
      },
      ['/0/0', '/0/1', '/1/0', '/1/1', '/1/2'].map((place) => `/formFactorSquared${place}`),
    ],
    ['no electrons', { electronsPerCell: 0 }, ['/electronsPerCell']],
    ['screened as text', { screened: 'no' }, ['/screened']],
    ['a misspelt field', { bandgap: '1 eV' }, ['/bandgap']],
    ['a field of another issue', { quantity: 'formFactorSquared' }, ['/quantity']],
    ['a pair energy below the gap', { energyPerPair: '1 eV' }, ['/energyPerPair']],
  ])('POST /v1/crystals: %s is refused', async (_what, over, pointers) => {
    expect(await refusedAt(inventedTable(over))).toEqual(pointers);
  });

  test('POST /v1/crystals: every fault at once', async () => {
    const table = inventedTable({
      name: 5,
      cellMass: 52,
      extra: 1,
      momentum: { unit: 'kg', edges: [2, 1, 4] },
      formFactorSquared: [
        [1, 2, 3],
        [1, -1],
      ],
    });
    expect((await refusedAt(table)).sort()).toEqual([
      '/cellMass',
      '/extra',
      '/formFactorSquared/1',
      '/formFactorSquared/1/1',
      '/momentum/edges/1',
      '/momentum/unit',
      '/name',
    ]);
  });

  test('POST /v1/crystals: of 50,000 bad values, 50 faults at most, the first offenders first', async () => {
    const formFactorSquared = Array.from({ length: 500 }, () => Array(100).fill(-1));
    const axes = {
      momentum: { unit: 'keV', edges: { start: 1, step: 1, count: 501 } },
      energy: { unit: 'eV', edges: { start: 1, step: 1, count: 101 } },
    };
    const response = await store(inventedTable({ ...axes, formFactorSquared }));
    const { errors } = await problemOf(response, 'invalid-input');
    expect(errors).toHaveLength(50);
    expect(errors![0].pointer).toBe('/formFactorSquared/0/0');
    expect(errors![49].pointer).toBe('/formFactorSquared/0/49');
  });

  test('POST /v1/crystals: a table that is refused leaves nothing behind', async () => {
    const fresh = testApp();
    await refusedAt(inventedTable({ name: '' }));
    await problemOf(await fresh.post('/v1/crystals', '{'), 'malformed-body');
    expect(CrystalList.parse(await (await fresh.get('/v1/crystals')).json()).crystals.every((c) => c.builtIn)).toBe(
      true,
    );
  });
});

describe('GET /v1/crystals', () => {
  test('GET /v1/crystals: built-ins first, then by name', async () => {
    const fresh = testApp();
    for (const name of ['b', 'a', 'c']) await stored(inventedTable({ name }), fresh);
    const response = await fresh.get('/v1/crystals');
    const { crystals } = CrystalList.parse(await response.json());
    expect(crystals.map(({ builtIn, name }) => (builtIn ? 'built in' : name))).toEqual([
      'built in',
      'built in',
      'a',
      'b',
      'c',
    ]);
    expect(crystals.slice(0, 2).map(({ aliases }) => aliases[0])).toEqual(['silicon', 'silicon-unscreened']);
    expect(response.headers.get('cache-control')).toBe('no-cache');
  });
});

describe('GET /v1/crystals/{id}', () => {
  test('GET /v1/crystals/silicon: provenance and stated accuracy; screened', async () => {
    const description = CrystalDescription.parse(await (await app.get('/v1/crystals/silicon')).json());
    expect(description).toMatchObject({ builtIn: true, screened: true, electronsPerCell: 8, aliases: ['silicon'] });
    expect(description.source!.length).toBeGreaterThan(20);
    expect(description.accuracy!.length).toBeGreaterThan(0);
    const bare = CrystalDescription.parse(await (await app.get('/v1/crystals/silicon-unscreened')).json());
    expect(bare.screened).toBe(false);
    expect(bare.id).not.toBe(description.id);
  });

  test('GET /v1/crystals/{id}: by id immutable with an ETag, by alias no-cache with the same one', async () => {
    for (const [path, variant] of [
      ['', ''],
      ['/values', '-values'],
    ]) {
      const byAlias = await app.get(`/v1/crystals/silicon${path}`);
      const id = /^"([0-9a-f]{64})/.exec(byAlias.headers.get('etag')!)![1];
      const byId = await app.get(`/v1/crystals/${id}${path}`);
      expect(byId.headers.get('etag')).toBe(`"${id}${variant}"`);
      expect(byAlias.headers.get('etag')).toBe(byId.headers.get('etag'));
      expect(byAlias.headers.get('cache-control')).toBe('no-cache');
      expect(byId.headers.get('cache-control')).toMatch(/max-age=\d{7,}, immutable/);
      expect(await byId.text()).toBe(await byAlias.text());
    }
  });

  test.each([
    ['', '*', 304],
    ['', 'own', 304],
    ['', 'W/own', 304],
    ['', '"x", own', 304],
    ['', '"x"', 200],
    ['/values', 'own', 304],
    ['/values', '"x"', 200],
  ])('GET /v1/crystals/{id}%s: If-None-Match %s answers %i', async (path, given, status) => {
    const { id } = await stored(inventedTable());
    const etag = (await app.get(`/v1/crystals/${id}${path}`)).headers.get('etag')!;
    const response = await app.get(`/v1/crystals/${id}${path}`, { 'if-none-match': given.replace('own', etag) });
    expect(response.status).toBe(status);
    expect(response.headers.get('etag')).toBe(etag);
    expect(response.headers.get('cache-control')).toMatch(/immutable/);
    expect((await response.text()) === '').toBe(status === 304);
  });

  test.each([
    'unobtainium',
    '0'.repeat(64),
    'F'.repeat(64),
    '..%2f..%2fetc%2fpasswd',
    '..%2F..%2F..%2Fpackage.json',
    '%2e%2e',
    '%00',
    '%zz',
    '__proto__',
    'constructor',
    'x'.repeat(5000),
  ])('GET /v1/crystals/%s: 404, and so for its values and its deletion', async (name) => {
    await problemOf(await app.get(`/v1/crystals/${name}`), 'not-found');
    await problemOf(await app.get(`/v1/crystals/${name}/values`), 'not-found');
    await problemOf(await app.call('DELETE', `/v1/crystals/${name}`), 'not-found');
  });
});

describe('GET /v1/crystals/{id}/values', () => {
  const tables: readonly [string, Json][] = [
    ['edges', inventedTable()],
    ['a formula and a source', inventedTable({ cellMass: { formula: 'GaAs' }, source: 'é “…” \u2028 \\ "' })],
    [
      'numbers of every size',
      inventedTable({
        cellMass: '5.232123456789012e1 GeV',
        cellVolume: '1e-30 angstrom^3',
        electronsPerCell: 1 / 3,
        bandGap: '0 eV',
        formFactorSquared: [
          [5e-324, 1e-300, 0.1 + 0.2],
          [1e300, 1 / 3, 0],
        ],
      }),
    ],
    [
      'converted axes',
      inventedTable({
        momentum: { unit: '1/angstrom', edges: { start: 0.1, step: 0.7, count: 3 } },
        energy: { unit: 'meV', edges: [1 / 3, 1000 / 3, 10_000 / 3, 1e5 / 3] },
      }),
    ],
    [
      'a loss function at points',
      inventedTable({
        momentum: { unit: 'keV', points: [1, 2] },
        energy: { unit: 'eV', points: [2, 8] },
        cellVolume: '40 angstrom^3',
        formFactorSquared: undefined,
        lossFunction: [
          [0.1, 0.2],
          [0.3, 0.4],
        ],
      }),
    ],
  ];
  test.each(tables)(
    'GET /v1/crystals/{id}/values: %s posted back is the same table with identical rates',
    async (_what, table) => {
      const { id } = await stored(table);
      const text = await (await app.get(`/v1/crystals/${id}/values`)).text();
      CrystalValues.parse(JSON.parse(text));
      const elsewhere = testApp();
      expect((await stored(text, elsewhere)).id).toBe(id);
      const scenario = inventedScenario({ crystal: { id } });
      const answer = await (await app.post('/v1/rates', scenario)).text();
      expect(await (await elsewhere.post('/v1/rates', scenario)).text()).toBe(answer);
      expect(await (await app.post('/v1/rates', { ...scenario, crystal: JSON.parse(text) })).text()).toBe(answer);
    },
  );

  test('GET /v1/crystals/silicon/values: posted back it is the built-in table itself, 200', async () => {
    const text = await (await app.get('/v1/crystals/silicon/values')).text();
    const response = await store(text);
    expect(response.status).toBe(200);
    expect(await response.json()).toMatchObject({ builtIn: true, aliases: ['silicon'] });
  });

  test('GET /v1/crystals/{id}/values: a failure carries no validators, whatever the origin', async () => {
    const run = () => Promise.reject(new Error('broken on purpose'));
    const broken = testApp({ corsOrigins: ['https://a.example'], compute: { run, workers: 1, async close() {} } });
    const { id } = (await (await app.get('/v1/crystals/silicon')).json()) as { id: string };
    for (const headers of [{}, { origin: 'https://a.example' }]) {
      const response = await broken.get(`/v1/crystals/${id}/values`, headers);
      await problemOf(response, 'internal');
      expect(response.headers.get('etag')).toBeNull();
    }
  });
});

describe('DELETE /v1/crystals/{id}', () => {
  test('DELETE /v1/crystals/{id}: 204, then it is gone everywhere', async () => {
    const { id } = await stored(inventedTable({ name: 'to be deleted' }));
    const scenario = inventedScenario({ crystal: { id } });
    expect((await app.post('/v1/rates', scenario)).status).toBe(200);
    const response = await app.call('DELETE', `/v1/crystals/${id}`);
    expect([response.status, await response.text()]).toEqual([204, '']);
    await problemOf(await app.call('DELETE', `/v1/crystals/${id}`), 'not-found');
    await problemOf(await app.get(`/v1/crystals/${id}`), 'not-found');
    await problemOf(await app.get(`/v1/crystals/${id}/values`), 'not-found');
    expect(await pointersOf(await app.post('/v1/rates', scenario))).toEqual(['/crystal/id']);
    expect((await store(inventedTable({ name: 'to be deleted' }))).status).toBe(201);
  });

  test('DELETE /v1/crystals/{id}: a built-in is 409, by alias and by id', async () => {
    const { id } = (await (await app.get('/v1/crystals/silicon')).json()) as { id: string };
    for (const name of ['silicon', id]) await problemOf(await app.call('DELETE', `/v1/crystals/${name}`), 'in-use');
    expect((await app.get('/v1/crystals/silicon')).status).toBe(200);
  });

  test('DELETE /v1/crystals/{id}: 409 while a computation uses it, 204 after', async () => {
    const inProcess = inProcessCompute();
    let finish = (): void => {};
    const held = new Promise<void>((resolve) => {
      finish = resolve;
    });
    let started = (): void => {};
    const running = new Promise<void>((resolve) => {
      started = resolve;
    });
    const slow = testApp({
      compute: {
        async run(task, input, options) {
          if (task === 'rates') {
            started();
            await held;
          }
          return (await inProcess.run(task, input, options)) as never;
        },
        workers: 1,
        async close() {},
      },
    });
    const { id } = await stored(inventedTable(), slow);
    const rates = slow.post('/v1/rates', inventedScenario({ crystal: { id } }));
    await running;
    await problemOf(await slow.call('DELETE', `/v1/crystals/${id}`), 'in-use');
    finish();
    expect((await rates).status).toBe(200);
    expect((await slow.call('DELETE', `/v1/crystals/${id}`)).status).toBe(204);
  });
});

test('POST /v1/crystals: a faulty band gap is told once, not also of the pair energy', async () => {
  expect(await refusedAt(changedAt(inventedTable(), '/bandGap', 10))).toEqual(['/bandGap']);
});
