import fs from 'node:fs';
import { gzipSync } from 'node:zlib';
import { afterEach, describe, expect, test } from 'vitest';
import { CrystalDescription } from '../../service/schemas/crystal.ts';
import numpy from '../fixtures/numpy-files.json' with { type: 'json' };
import { inventedScenario, inventedTable, type Json } from '../support/invented.ts';
import { pointersOf, problemOf } from '../support/problem-of.ts';
import { type TestApp, testApp, UPLOADS } from '../support/test-app.ts';
import {
  FORM_TYPE,
  formBytes,
  hdf5Of,
  npyAround,
  npyHeader,
  npyOf,
  postForm,
  tableForm,
  upload,
  withoutValues,
} from '../support/upload-form.ts';

const app = testApp();
const matrix = [
  [0.5, 0.25, 3],
  [0, 1.5, 2],
];
const table = inventedTable({ formFactorSquared: matrix });
const said = withoutValues(table);
const idOf = async (response: Response): Promise<string> => {
  const text = await response.text();
  expect([200, 201], text.slice(0, 600)).toContain(response.status);
  return CrystalDescription.parse(JSON.parse(text)).id;
};
const byJson = async (body: Json): Promise<string> => idOf(await testApp().post('/v1/crystals', body));
const id = await byJson(table);
const pointTable = (over: Json = {}): Json => ({
  ...table,
  momentum: { unit: 'keV', points: [1, 2] },
  energy: { unit: 'eV', points: [2, 8, 16] },
  ...over,
});
const pointId = await byJson(pointTable());
const f8 = (rows: readonly (readonly number[])[]): Float64Array => Float64Array.from(rows.flat());

async function described(response: Response) {
  const text = await response.text();
  expect([200, 201], text.slice(0, 600)).toContain(response.status);
  return CrystalDescription.parse(JSON.parse(text));
}

afterEach(() => expect(fs.existsSync(UPLOADS) ? fs.readdirSync(UPLOADS) : []).toEqual([]));

describe('POST /v1/crystals, a form with .npy', () => {
  test.each(Object.entries(numpy.files))(
    'POST /v1/crystals: NumPy’s own file, %s, is the table',
    async (_name, file) => {
      expect(numpy.matrix).toEqual(matrix);
      expect(await idOf(await upload(app, said, Buffer.from(file, 'base64')))).toBe(id);
    },
  );

  test('POST /v1/crystals: 201 and a Location, then 200; what was inferred is said, and the same each time', async () => {
    const fresh = testApp();
    const file = Buffer.from(numpy.files['>f4 F 1'], 'base64');
    const first = await upload(fresh, said, gzipSync(file));
    expect([first.status, first.headers.get('location')]).toEqual([201, `/v1/crystals/${id}`]);
    const { inferred } = await described(first);
    expect(inferred).toEqual([
      'values: packed with gzip',
      'values: .npy of float32, big endian, 2 × 3, in Fortran order: put in rows',
    ]);
    const again = await upload(fresh, said, gzipSync(file));
    expect(again.status).toBe(200);
    expect((await described(again)).inferred).toEqual(inferred);
    const description = await described(await fresh.get(`/v1/crystals/${id}`));
    expect(description.inferred).toBeUndefined();
  });

  test.each<[string, Parameters<typeof formBytes>[0]]>([
    [
      'the values first',
      [
        { name: 'values', content: npyOf(matrix) },
        { name: 'description', content: JSON.stringify(said) },
      ],
    ],
    [
      'file names on both parts',
      [
        { name: 'description', content: JSON.stringify(said), filename: 'description.json', type: 'application/json' },
        {
          name: 'values',
          content: npyOf(matrix),
          filename: 'C:\\ta"ble\\values.txt',
          type: 'application/octet-stream',
        },
      ],
    ],
  ])('POST /v1/crystals: %s', async (_what, parts) => {
    expect(await idOf(await postForm(app, formBytes(parts)))).toBe(id);
  });

  test('POST /v1/crystals: a whole form packed with gzip, as any body', async () => {
    const form = gzipSync(tableForm(said, npyOf(matrix)));
    expect(await idOf(await postForm(app, form, { 'content-encoding': 'gzip' }))).toBe(id);
  });

  test('POST /v1/crystals: a loss function by its quantity; −0 is 0', async () => {
    const json = inventedTable({ cellVolume: '40 angstrom^3', formFactorSquared: undefined, lossFunction: matrix });
    const values = matrix.map((row) => row.map((value) => (value === 0 ? -0 : value)));
    const response = await upload(app, { ...withoutValues(json), quantity: 'lossFunction' }, npyOf(values));
    expect(await idOf(response)).toBe(await byJson(json));
  });
});

describe('POST /v1/crystals, a form with text', () => {
  const open = { ...said, momentum: { unit: 'keV' }, energy: { unit: 'eV' } };
  const units = withoutValues({ ...table, momentum: undefined, energy: undefined });
  const long = matrix.flatMap((row, i) => row.map((value, j) => [[1, 2][i], [2, 8, 16][j], value]));
  const lines = (rows: readonly (readonly unknown[])[], separator = ','): string =>
    rows.map((row) => row.join(separator)).join('\n');
  const points = [
    ['', 2, 8, 16],
    [1, ...matrix[0]],
    [2, ...matrix[1]],
  ];
  const edges = [
    ['q\\E', 0, 4, 8, 12],
    [1, ...matrix[0], ''],
    [2, ...matrix[1], ''],
    [4, '', '', '', ''],
  ];

  test.each<[string, Json, string, 'points' | 'edges']>([
    ['long form', open, lines(long), 'points'],
    ['long form with a header', open, `q,E,f2\n${lines(long)}\n`, 'points'],
    ['long form in any order of rows', open, lines([...long].reverse()), 'points'],
    [
      'long form in another order of columns',
      open,
      lines([['E', 'value', 'q'], ...long.map(([q, e, v]) => [e, v, q])]),
      'points',
    ],
    [
      'long form with units',
      units,
      `"momentum [MeV]";energy (eV);value\n${lines(
        long.map(([q, e, v]) => [q / 1000, e, v]),
        ';',
      )}`,
      'points',
    ],
    [
      'long form with spaces and comments',
      open,
      `# invented numbers\n${lines(
        long.map((row) => row.map((x) => x.toExponential(18))),
        '   ',
      )}`,
      'points',
    ],
    [
      'long form with tabs, CRLF and a byte order mark',
      open,
      `\ufeff${lines(long, '\t').replaceAll('\n', '\r\n')}\r\n\r\n`,
      'points',
    ],
    [
      'long form for axes that are given',
      said,
      lines(long.map(([q, e, v]) => [q + 0.5, (e === 2 ? 0 : e === 8 ? 4 : 8) + 2, v])),
      'edges',
    ],
    ['matrix form', open, lines(points), 'points'],
    ['matrix form with tabs', open, lines(points, '\t'), 'points'],
    [
      'matrix form with units',
      units,
      lines([['momentum (keV) \\ energy (eV)', 2, 8, 16], ...points.slice(1)]),
      'points',
    ],
    ['matrix form for cells', open, lines(edges), 'edges'],
    ['matrix form for cells, short rows', open, lines(edges.map((row) => row.filter((cell) => cell !== ''))), 'edges'],
    ['matrix form beside the same axes', said, lines(edges), 'edges'],
    ['the bare matrix', said, lines(matrix), 'edges'],
  ])('POST /v1/crystals: %s is the table', async (_what, description, text, kind) => {
    const answer = await described(await upload(app, description, text));
    expect(answer.id).toBe(kind === 'edges' ? id : pointId);
    expect(answer.inferred!.join('\n')).toMatch(/form|bare/);
    expect(await idOf(await upload(app, description, gzipSync(text)))).toBe(answer.id);
  });

  test('POST /v1/crystals: descending axes are refused in a matrix, by name; in long form the order of rows does not matter', async () => {
    const [head, ...rest] = points;
    const down = await problemOf(await upload(app, open, lines([head, ...rest.reverse()])), 'invalid-input');
    expect(down.errors).toEqual([
      { pointer: '/values', detail: expect.stringMatching(/^momentum: .*strictly increasing/) },
    ]);
    const back = lines(points.map(([first, ...row]) => [first, ...row.reverse()]));
    expect((await problemOf(await upload(app, open, back), 'invalid-input')).errors![0].detail).toMatch(/^energy: /);
    expect(
      await pointersOf(await upload(app, { ...said, energy: { unit: 'eV', edges: [12, 8, 4, 0] } }, npyOf(matrix))),
    ).toEqual(['/energy/edges/1']);
  });
});

const file = await hdf5Of((h5) => {
  h5.create_group('table');
  h5.create_dataset({ name: 'table/values', data: f8(matrix), shape: [2, 3] });
  h5.create_dataset({
    name: 'table/small',
    data: Float32Array.from(matrix.flat()),
    shape: [2, 3],
    chunks: [1, 2],
    compression: 6,
  });
  h5.create_dataset({ name: 'q', data: Float64Array.from([1, 2, 4]) });
  h5.create_dataset({ name: 'e', data: Float64Array.from([0, 4, 8, 12]) });
});

describe('POST /v1/crystals, a form with HDF5', () => {
  test.each<[string, Json]>([
    ['a dataset', { ...said, dataset: '/table/values' }],
    ['chunks packed with gzip', { ...said, dataset: 'table/small' }],
    [
      'axes in datasets',
      {
        ...said,
        dataset: '/table/values',
        momentum: { unit: 'keV', dataset: '/q' },
        energy: { unit: 'eV', dataset: '/e' },
      },
    ],
  ])('POST /v1/crystals: %s is the table', async (_what, description) => {
    expect(await idOf(await upload(app, description, file))).toBe(id);
    expect(await idOf(await upload(app, description, gzipSync(file)))).toBe(id);
  });

  test('POST /v1/crystals: the only table of a file needs no name; of two, one does', async () => {
    const alone = await hdf5Of((h5) => h5.create_dataset({ name: 'alone', data: f8(matrix), shape: [2, 3] }));
    const answer = await described(await upload(app, said, alone));
    expect(answer.id).toBe(id);
    expect(answer.inferred!.join()).toContain('/alone');
    expect(await pointersOf(await upload(app, said, file))).toEqual(['/dataset']);
  });

  test('POST /v1/crystals: a big-endian dataset is turned round', async () => {
    const bytes = Buffer.from(await hdf5Of((h5) => h5.create_dataset({ name: 'v', data: f8(matrix), shape: [2, 3] })));
    const data = bytes.indexOf(Buffer.from(f8(matrix).buffer));
    bytes.subarray(data, data + 48).swap64();
    // the datatype message of IEEE float64: class 1 version 1, byte order in bit 0 (HDF5 file format specification, IV.A.2.d)
    const type = bytes.indexOf(Buffer.from([0x11, 0x20, 0x3f, 0x00, 0x08, 0x00, 0x00, 0x00]));
    expect(Math.min(data, type)).toBeGreaterThan(0);
    bytes[type + 1] |= 1;
    const answer = await described(await upload(app, said, bytes));
    expect([answer.id, answer.inferred![0]]).toEqual([id, expect.stringContaining('big endian')]);
  });
});

describe('POST /v1/crystals, forms that are refused', () => {
  test('POST /v1/crystals: faults of both parts at once, each where it is', async () => {
    const description = {
      ...said,
      name: 5,
      extra: 1,
      quantity: 'something',
      momentum: { unit: 'kg', edges: [1, 2, 4] },
    };
    const response = await upload(
      app,
      description,
      npyOf([
        [1, -2, 3],
        [Number.NaN, 2, Infinity],
      ]),
    );
    expect((await pointersOf(response)).sort()).toEqual(
      ['/extra', '/momentum/unit', '/name', '/quantity', '/values/0/1', '/values/1/0', '/values/1/2'].sort(),
    );
  });

  test('POST /v1/crystals: a dielectric function is refused for what it is', async () => {
    const response = await upload(app, { ...said, quantity: 'dielectricFunction' }, npyOf(matrix));
    expect(await pointersOf(response)).toEqual(['/quantity']);
  });

  test('POST /v1/crystals: another media type is 415 and says what is read', async () => {
    const response = await app.post('/v1/crystals', 'x', { 'content-type': 'text/csv' });
    await problemOf(response, 'media-type');
    expect(response.headers.get('accept-post')).toBe('application/json, multipart/form-data');
    await problemOf(
      await app.post('/v1/rates', tableForm(said, npyOf(matrix)), { 'content-type': FORM_TYPE }),
      'media-type',
    );
  });

  test('POST /v1/crystals: a shape turned over is refused with a hint', async () => {
    const file = npyAround(npyHeader('(3, 2)'), new Uint8Array(48));
    const { errors } = await problemOf(await upload(app, said, file), 'invalid-input');
    expect(errors![0].detail).toMatch(/3 × 2.*2 × 3.*turned over/);
  });

  test('POST /v1/crystals: a disk that refuses is 507', async () => {
    const refusing = testApp({ uploadFolder: '/proc/version/uploads' });
    await problemOf(await upload(refusing, said, npyOf(matrix)), 'storage-full');
  });
});

describe('GET /v1/crystals/{id}/values by Accept', () => {
  const tables: readonly [string, Json][] = [
    ['cells', table],
    ['points', pointTable()],
    [
      'numbers of every size',
      inventedTable({
        formFactorSquared: [
          [5e-324, 1e-300, 0.1 + 0.2],
          [1e300, 1 / 3, 0],
        ],
      }),
    ],
    ['converted axes', inventedTable({ momentum: { unit: '1/angstrom', edges: { start: 0.1, step: 0.7, count: 3 } } })],
  ];
  const fetched = async (at: TestApp, which: string, accept: string) =>
    at.get(`/v1/crystals/${which}/values`, { accept });

  test.each(tables)(
    'GET /v1/crystals/{id}/values: %s as .npy and CSV, posted back, are the same table with identical rates',
    async (_what, json) => {
      const own = await idOf(await app.post('/v1/crystals', json));
      const rates = async (at: TestApp) =>
        (await at.post('/v1/rates', inventedScenario({ crystal: { id: own } }))).text();
      for (const accept of ['application/octet-stream', 'text/csv']) {
        const elsewhere = testApp();
        const bytes = new Uint8Array(await (await fetched(app, own, accept)).arrayBuffer());
        expect(await idOf(await upload(elsewhere, withoutValues(json), bytes))).toBe(own);
        expect(await rates(elsewhere)).toBe(await rates(app));
      }
      // a CSV brings its axes itself
      const csv = await (await fetched(app, own, 'text/csv')).text();
      const { momentum: _q, energy: _e, ...rest } = withoutValues(json);
      expect(await idOf(await upload(testApp(), rest, csv))).toBe(own);
    },
  );

  test('GET /v1/crystals/silicon/values: .npy and CSV of a built-in are the built-in', async () => {
    const whole = (await (await app.get('/v1/crystals/silicon/values')).json()) as Json;
    for (const accept of ['application/octet-stream', 'text/csv']) {
      const bytes = new Uint8Array(await (await fetched(app, 'silicon', accept)).arrayBuffer());
      const answer = await described(await upload(app, withoutValues(whole), bytes));
      expect(answer.builtIn).toBe(true);
    }
  });

  test('GET /v1/crystals/{id}/values: each form has its own ETag, type and name; HEAD the same headers', async () => {
    await app.post('/v1/crystals', table);
    const tags = new Set<string>();
    for (const [accept, type, ending] of [
      ['application/json', 'application/json', undefined],
      ['application/octet-stream', 'application/octet-stream', 'npy'],
      ['text/csv', 'text/csv; charset=utf-8', 'csv'],
      ['text/csv;q=0.5, application/octet-stream', 'application/octet-stream', 'npy'],
      ['*/*', 'application/json', undefined],
    ] as const) {
      const response = await fetched(app, id, accept);
      expect([response.status, response.headers.get('content-type')]).toEqual([200, type]);
      expect(response.headers.get('content-disposition')).toBe(
        ending ? `attachment; filename="${id}.${ending}"` : null,
      );
      expect(response.headers.get('vary')).toBe('Accept');
      const body = await response.arrayBuffer();
      if (ending === 'npy') expect(response.headers.get('content-length')).toBe(String(body.byteLength));
      const etag = response.headers.get('etag')!;
      tags.add(etag);
      const unchanged = await app.get(`/v1/crystals/${id}/values`, { accept, 'if-none-match': etag });
      expect([unchanged.status, unchanged.headers.get('vary')]).toEqual([304, 'Accept']);
      const head = await app.call('HEAD', `/v1/crystals/${id}/values`, undefined, { accept });
      expect([head.status, await head.text(), head.headers.get('etag')]).toEqual([200, '', etag]);
    }
    expect(tags.size).toBe(3);
    await problemOf(await fetched(app, id, 'text/html'), 'not-acceptable');
  });
});
