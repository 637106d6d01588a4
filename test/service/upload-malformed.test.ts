/** Files that are no tables: each a clear refusal, nothing left on the disk, and the service answers as before. */
import fs from 'node:fs';
import { gzipSync } from 'node:zlib';
import { describe, expect, test } from 'vitest';
import { CrystalList } from '../../service/schemas/crystal.ts';
import { inventedTable, type Json } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { testApp, UPLOADS } from '../support/test-app.ts';
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
const MIB = 2 ** 20;
const matrix = [
  [0.5, 0.25, 3],
  [0, 1.5, 2],
];
const said = withoutValues(inventedTable());
const open: Json = { ...said, momentum: { unit: 'keV' }, energy: { unit: 'eV' } };
const npy = npyOf(matrix);
const dataAt = npy.indexOf('\n') + 1;
const data = npy.subarray(dataAt);
const long = 'q,E,f\n1,2,0.1\n1,3,0.2\n2,2,0.3\n2,3,0.4\n';
const grid = ',2,8,16\n1,0.1,0.2,0.3\n2,0.4,0.5,0.6\n';
const hdf5 = await hdf5Of((h5) => {
  h5.create_dataset({ name: 'v', data: Float64Array.from(matrix.flat()), shape: [2, 3] });
  h5.create_dataset({
    name: 'packed',
    data: new Float64Array(6).fill(1 / 3),
    shape: [2, 3],
    chunks: [2, 3],
    compression: 9,
  });
  h5.create_dataset({ name: 'whole', data: Int32Array.from([1, 2, 3, 4, 5, 6]), shape: [2, 3] });
  h5.create_dataset({ name: 'flat', data: Float64Array.from([1, 2, 3, 4, 5, 6]), shape: [6] });
  h5.create_dataset({ name: 'text', data: ['a', 'b'] });
  h5.create_group('group');
  h5.create_external_link('/etc/passwd', '/v', 'outside');
  h5.create_soft_link('/nowhere', 'broken');
  h5.create_soft_link('/loop', 'loop');
});
const at = (dataset: string): Json => ({ ...said, dataset });

/** The file's copy with other bytes where `marker` is. */
function changed(file: Uint8Array, marker: Uint8Array, change: (at: Buffer) => void): Buffer {
  const copy = Buffer.from(file);
  const place = copy.indexOf(marker);
  expect(place).toBeGreaterThan(0);
  change(copy.subarray(place, place + marker.length));
  return copy;
}

async function refused(response: Response, type: string, pointers?: readonly string[]) {
  const problem = await problemOf(response, type);
  expect(problem.detail.length).toBeGreaterThan(10);
  if (pointers) expect(problem.errors!.map(({ pointer }) => pointer)).toEqual(pointers);
  expect(JSON.stringify(problem)).not.toContain(UPLOADS);
  await nothingLeft();
  return problem;
}

async function nothingLeft(): Promise<void> {
  expect(fs.existsSync(UPLOADS) ? fs.readdirSync(UPLOADS) : []).toEqual([]);
  const { crystals } = CrystalList.parse(await (await app.get('/v1/crystals')).json());
  expect(crystals.filter(({ builtIn }) => !builtIn)).toEqual([]);
  expect(app.errors).toEqual([]);
}

type Malformed = readonly [what: string, description: unknown, file: string | Uint8Array, pointers: readonly string[]];
const HERE = ['/values'];

const NPY: readonly Malformed[] = [
  ...[1, 5, 6, 7, 8, 9, 10, 11, 40, dataAt - 1, dataAt, dataAt + 1, npy.length - 8, npy.length - 1].map(
    (length): Malformed => [`.npy cut after ${length} bytes`, said, npy.subarray(0, length), HERE],
  ),
  ['.npy with a byte too many', said, Buffer.concat([npy, Buffer.from([0])]), HERE],
  ['.npy of version 4', said, npyAround(npyHeader('(2, 3)'), data, 4), HERE],
  ['.npy of version 0', said, npyAround(npyHeader('(2, 3)'), data, 0), HERE],
  [
    '.npy that declares 4 GiB of header',
    said,
    Buffer.concat([npyAround('', Buffer.alloc(0), 2).subarray(0, 8), Buffer.alloc(100, 255)]),
    HERE,
  ],
  ['.npy with an empty header', said, npyAround('', data), HERE],
  ['.npy with a header that is code', said, npyAround("__import__('os').system('true')\n", data), HERE],
  ['.npy without a shape', said, npyAround("{'descr': '<f8', 'fortran_order': False, }", data), HERE],
  [
    '.npy with one field more',
    said,
    npyAround("{'descr': '<f8', 'fortran_order': False, 'shape': (2, 3), 'x': True, }", data),
    HERE,
  ],
  ['.npy with a negative shape', said, npyAround(npyHeader('(-2, -3)'), data), HERE],
  ['.npy of one dimension', said, npyAround(npyHeader('(6,)'), data), HERE],
  ['.npy of no dimension', said, npyAround(npyHeader('()'), data), HERE],
  ['.npy of three dimensions', said, npyAround(npyHeader('(1, 2, 3)'), data), HERE],
  ['.npy of another shape', said, npyAround(npyHeader('(3, 2)'), data), HERE],
  ['.npy of no rows', said, npyAround(npyHeader('(0, 3)'), Buffer.alloc(0)), HERE],
  [
    '.npy that declares 10¹² values',
    open,
    npyAround(npyHeader('(1000000, 1000000)'), data),
    [...HERE, '/momentum', '/energy'].slice(0, 1),
  ],
  ['.npy that declares 10³⁰ values', said, npyAround(npyHeader('(999999999999999, 999999999999999)'), data), HERE],
  ['.npy that declares more than it has', said, npyAround(npyHeader('(2, 3)', "'<f8'"), data.subarray(8)), HERE],
  ['.npy of float32 declared as float64', said, npyAround(npyHeader('(2, 3)', "'<f8'"), Buffer.alloc(24)), HERE],
  ...["'|O'", "'<f2'", "'<i8'", "'<c16'", "'<U4'", "'|b1'", "[('q', '<f8'), ('E', '<f8')]"].map(
    (type): Malformed => [`.npy of ${type}`, said, npyAround(npyHeader('(2, 3)', type), data), HERE],
  ),
  [
    '.npy with a value that is none',
    said,
    npyOf([
      [1, Number.NaN, 3],
      [1, 2, 3],
    ]),
    ['/values/0/1'],
  ],
  [
    '.npy with an infinite value',
    said,
    npyOf([
      [1, 2, 3],
      [1, 2, Infinity],
    ]),
    ['/values/1/2'],
  ],
  [
    '.npy with a negative value',
    said,
    npyOf([
      [-1, 2, 3],
      [1, 2, 3],
    ]),
    ['/values/0/0'],
  ],
  ['.npy and axes that nobody gives', open, npy, ['/momentum', '/energy']],
  [
    '.npy and an axis that descends',
    { ...said, momentum: { unit: 'keV', edges: [4, 2, 1] } },
    npy,
    ['/momentum/edges/1'],
  ],
  ['.npy and a path of HDF5', at('/v'), npy, ['/dataset']],
  ['.npz', said, Buffer.concat([Buffer.from('PK\x03\x04'), Buffer.alloc(100)]), HERE],
];

const TEXT: readonly Malformed[] = [
  ['an empty file', said, '', HERE],
  ['nothing but blank lines and comments', open, '\n\n  \n# nothing\n', HERE],
  ['a sentence', open, 'these are no numbers at all', HERE],
  ['bytes of no format', open, Uint8Array.from({ length: 500 }, (_, i) => (i * 37) % 256), HERE],
  ['zeros', open, Buffer.alloc(1000), HERE],
  ['Latin-1', open, Buffer.from(`${long}1,2,é\n`, 'latin1'), HERE],
  ['UTF-16', open, Buffer.from(`\ufeff${grid}`, 'utf16le'), HERE],
  ['JSON in place of a table', open, JSON.stringify(matrix), HERE],
  ['text in a cell', open, grid.replace('0.5', 'abc'), ['/values/1/1']],
  ['an empty cell', open, grid.replace('0.5', ''), ['/values/1/1']],
  ['nan and inf', open, grid.replace('0.5', 'nan').replace('0.6', 'inf'), ['/values/1/1', '/values/1/2']],
  ['a number beyond all numbers', open, grid.replace('0.5', '1e999'), ['/values/1/1']],
  ['a hexadecimal number', open, grid.replace('0.5', '0x5'), ['/values/1/1']],
  ['a negative number', open, grid.replace('0.5', '-0.5'), ['/values/1/1']],
  ['a row that is too short', open, grid.replace('0.4,', ''), ['/values/1']],
  ['a row that is too long', open, grid.replace('0.4,', '0.4,1,'), ['/values/1']],
  ['a matrix cut in the middle of a row', open, grid.slice(0, -9), ['/values/1']],
  ['a momentum that is text', open, grid.replace('\n2,', '\nx,'), HERE],
  ['a momentum there twice', open, grid.replace('\n2,', '\n1,'), HERE],
  ['energies that descend', open, grid.replace('2,8,16', '16,8,2'), HERE],
  ['a single row', open, grid.split('\n').slice(0, 2).join('\n'), HERE],
  ['axes that are not those of the description', said, grid, HERE],
  ['long form with a cell there twice', open, `${long}1,2,0.1\n`, ['/values/0/0']],
  ['long form with a cell missing', open, long.replace('2,2,0.3\n', ''), ['/values/1/0']],
  ['long form with text for a value', open, long.replace('0.3', 'x'), ['/values/1/0']],
  ['long form with text for an energy', open, long.replace('1,3,', '1,x,'), HERE],
  ['long form with a row of two cells', open, `${long}1,2\n`, HERE],
  ['long form with one momentum', open, 'q,E,f\n1,2,3\n1,3,4\n', HERE],
  [
    'long form where every row has axes of its own',
    open,
    Array.from({ length: 6000 }, (_, i) => `${i},${i / 7},1`).join('\n'),
    HERE,
  ],
  ['quotation marks that do not close', open, `${long}"1,2,3\n1,4,5\n`, HERE],
  ['a line of 20 MiB', open, `1,${'1'.repeat(20 * MIB)}`, HERE],
  ['no unit anywhere', { ...open, momentum: undefined }, grid, ['/momentum/unit']],
];

const GZIP: readonly Malformed[] = [
  ['gzip cut short', said, gzipSync(npy).subarray(0, -5), HERE],
  ['gzip of its header alone', said, gzipSync(npy).subarray(0, 10), HERE],
  ['two bytes of gzip', said, Uint8Array.of(0x1f, 0x8b), HERE],
  ['gzip with garbage behind it', said, Buffer.concat([gzipSync(npy), Buffer.from('garbage')]), HERE],
  [
    'gzip with a broken checksum',
    said,
    changed(gzipSync(npy), gzipSync(npy).subarray(-8, -4), (crc) => crc.fill(7)),
    HERE,
  ],
  ['gzip within gzip', said, gzipSync(gzipSync(npy)), HERE],
  ['gzip of nothing', said, gzipSync(''), HERE],
];

const HDF5: readonly Malformed[] = [
  ['HDF5 of its first bytes alone', said, hdf5.subarray(0, 8), HERE],
  ['HDF5 cut in its superblock', said, hdf5.subarray(0, 60), HERE],
  ['HDF5 cut to half', at('/v'), hdf5.subarray(0, hdf5.length / 2), HERE],
  ['HDF5 followed by garbage', said, Buffer.concat([hdf5.subarray(0, 8), Buffer.alloc(5000, 0xa5)]), HERE],
  ['HDF5 without the dataset', at('/other'), hdf5, ['/dataset']],
  ['HDF5 with a group for a dataset', at('/group'), hdf5, ['/dataset']],
  ['HDF5 of whole numbers', at('/whole'), hdf5, ['/dataset']],
  ['HDF5 of texts', at('/text'), hdf5, ['/dataset']],
  ['HDF5 of one dimension', at('/flat'), hdf5, ['/dataset']],
  ['HDF5 with a link to another file', at('/outside'), hdf5, ['/dataset']],
  ['HDF5 with a link to nothing', at('/broken'), hdf5, ['/dataset']],
  ['HDF5 with a link to itself', at('/loop'), hdf5, ['/dataset']],
  [
    'HDF5 with a damaged chunk',
    at('/packed'),
    changed(hdf5, Uint8Array.of(0x78, 0xda), (zlib) => zlib.fill(0xff)),
    HERE,
  ],
  [
    'HDF5 with an axis that is no dataset',
    { ...at('/v'), momentum: { unit: 'keV', dataset: '/q' } },
    hdf5,
    ['/momentum/dataset'],
  ],
  [
    'HDF5 with an axis of another length',
    { ...at('/v'), momentum: { unit: 'keV', dataset: '/flat' } },
    hdf5,
    ['/momentum/dataset'],
  ],
  ['HDF5 with a path that is none', { ...said, dataset: 5 }, hdf5, ['/dataset']],
];

describe('POST /v1/crystals, malformed files', () => {
  test.each([...NPY, ...TEXT, ...GZIP, ...HDF5])(
    'POST /v1/crystals: %s',
    async (_what, description, file, pointers) => {
      await refused(await upload(app, description, file), 'invalid-input', pointers);
    },
  );

  test('POST /v1/crystals: HDF5 with bytes changed at random never does more than be refused', async () => {
    let state = 11;
    const random = (): number => {
      state = (state * 48271) % 2147483647;
      return state / 2147483647;
    };
    for (let round = 0; round < 8; round++) {
      const broken = Buffer.from(hdf5);
      for (let k = 0; k < 40; k++)
        broken[8 + Math.floor(random() * (broken.length - 8))] ^= 1 + Math.floor(random() * 255);
      const response = await testApp().post('/v1/crystals', tableForm(at('/v'), broken), { 'content-type': FORM_TYPE });
      expect([201, 422]).toContain(response.status);
    }
    await nothingLeft();
  });

  test('POST /v1/crystals: a gzip of 300 MiB of zeros, 300 kB as it is sent, is 413', async () => {
    const bomb = gzipSync(Buffer.alloc(300 * MIB));
    expect(bomb.length).toBeLessThan(MIB);
    await refused(await upload(app, said, bomb), 'too-large');
    const wholeForm = gzipSync(tableForm(said, Buffer.alloc(300 * MIB)));
    await refused(await postForm(app, wholeForm, { 'content-encoding': 'gzip' }), 'too-large');
  });

  test('POST /v1/crystals: of 50,000 bad values, 50 faults at most and the number of all', async () => {
    const axes = {
      momentum: { unit: 'keV', edges: { start: 1, step: 1, count: 501 } },
      energy: { unit: 'eV', edges: { start: 1, step: 1, count: 101 } },
    };
    const file = npyOf(Array.from({ length: 500 }, () => Array(100).fill(-1)));
    const { errors } = await refused(await upload(app, { ...said, ...axes }, file), 'invalid-input');
    expect([errors!.length, errors![0].pointer, errors![49].pointer]).toEqual([50, '/values/0/0', '/values/0/49']);
  });
});

describe('POST /v1/crystals, malformed forms', () => {
  const whole = tableForm(said, npy);
  const text = JSON.stringify(said);
  const description = { name: 'description', content: text };
  const values = { name: 'values', content: npy, filename: 'values.npy' };

  test.each<[string, Buffer]>([
    ['an empty body', Buffer.alloc(0)],
    ['no form at all', Buffer.from('hello')],
    ['a form cut in its values', whole.subarray(0, whole.length - 60)],
    ['a form cut in its description', whole.subarray(0, 150)],
    ['a form cut in a part’s head', whole.subarray(0, 40)],
    ['a form without its last boundary', whole.subarray(0, whole.length - 12)],
    ['twenty parts', formBytes(Array.from({ length: 20 }, (_, i) => ({ name: `p${i}`, content: 'x' })))],
  ])('POST /v1/crystals: %s is 400', async (_what, form) => {
    await refused(await postForm(app, form), 'malformed-body');
  });

  test('POST /v1/crystals: a form without a boundary is 400', async () => {
    await refused(await app.post('/v1/crystals', whole, { 'content-type': 'multipart/form-data' }), 'malformed-body');
    await refused(
      await postForm(app, gzipSync(whole).subarray(0, 200), { 'content-encoding': 'gzip' }),
      'malformed-body',
    );
  });

  test.each<[string, string | Uint8Array]>([
    ['no JSON', 'hello'],
    ['cut short', text.slice(0, -1)],
    ['empty', ''],
    ['no UTF-8', Uint8Array.of(0x22, 0xe9, 0x22)],
    ['200,000 lists deep', '['.repeat(200_000)],
  ])('POST /v1/crystals: a description that is %s is 400', async (_what, content) => {
    const form = formBytes([{ name: 'description', content }, values]);
    const { detail } = await refused(await postForm(app, form), 'malformed-body');
    expect(detail).toContain('description');
  });

  test.each<[string, Parameters<typeof formBytes>[0], readonly string[]]>([
    ['no parts', [], ['/description', '/values']],
    ['no description', [values], ['/description']],
    ['no values', [description], ['/values']],
    ['two descriptions', [description, description, values], ['/description']],
    ['values twice', [description, values, values], ['/values']],
    ['a part of another name', [description, values, { name: 'file', content: 'x' }], ['/file']],
    ['a description that is a list', [{ name: 'description', content: '[]' }, values], ['']],
    [
      'values in the description',
      [{ name: 'description', content: JSON.stringify(inventedTable()) }, values],
      ['/formFactorSquared'],
    ],
  ])('POST /v1/crystals: %s is 422', async (_what, parts, pointers) => {
    await refused(await postForm(app, formBytes(parts)), 'invalid-input', pointers);
  });

  test('POST /v1/crystals: a description of 9 MiB, or a form of more than 256 MiB, is 413', async () => {
    await refused(await upload(app, { ...said, source: 'x'.repeat(9 * MIB) }, npy), 'too-large');
    await refused(await postForm(app, whole, { 'content-length': String(256 * MIB + 1) }), 'too-large');
  });
});
