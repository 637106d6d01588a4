import type { Context } from 'hono';
import { VALUES_TYPES, VARIANTS, type ValuesType, valuesDownload } from '../crystals/values-download.ts';
import { Problem } from '../problem.ts';
import { qualityOf } from '../quality-reports.ts';
import { defineRoute, negotiate } from '../route.ts';
import { CrystalDescription, CrystalList, CrystalValues } from '../schemas/crystal.ts';
import { CrystalUpload } from '../schemas/crystal-upload.ts';

const IMMUTABLE = 'public, max-age=31536000, immutable';
const ID = 'SHA-256 of the table, or the alias of a built-in one.';

const table = {
  name: 'Invented numbers',
  source: 'Made up to show the form of a table',
  cellMass: { formula: 'Si2' },
  cellVolume: '40.0 angstrom^3',
  electronsPerCell: 8,
  bandGap: '1.12 eV',
  energyPerPair: '3.8 eV',
  momentum: { unit: 'keV', edges: [1, 2, 4] },
  energy: { unit: 'eV', edges: { start: 0, step: 4, count: 4 } },
};

export function unknownTable(name: string): Problem {
  return new Problem('not-found', `No table has the id or alias "${name}"; GET /v1/crystals lists them.`);
}

/**
 * Validators of a table's representation: immutable by id, to be asked again by alias; and whether the caller has it already.
 * They go into the answer itself, not into the context: a failure must not carry them.
 */
function validatorsOf(c: Context, id: string, isAlias: boolean, variant: string) {
  const tag = `"${id}${variant}"`;
  const known = (c.req.header('if-none-match') ?? '').split(',').map((entry) => entry.trim().replace(/^W\//, ''));
  return {
    headers: { ETag: tag, 'Cache-Control': isAlias ? 'no-cache' : IMMUTABLE },
    unchanged: known.includes(tag) || known.includes('*'),
  };
}

export const postCrystal = defineRoute({
  method: 'post',
  path: '/v1/crystals',
  operationId: 'storeCrystal',
  tag: 'crystals',
  summary: 'Store a crystal form factor table',
  description: `Tables are content-addressed: the same table is stored once and can be posted again safely.

In JSON, or as a form (multipart/form-data, at most 256 MiB, also when unpacked) of two parts, in any order: \`description\`, the table
without its values in JSON, and \`values\`, a file. What kind of file it is its content says, not its name: .npy (float32 or float64,
either byte order, C or Fortran order), HDF5 (float32 or float64), CSV or TSV, each also packed with gzip. A text is in long form
(three columns: momentum, energy, value) or in matrix form (the first row energies, the first column momenta; for cells both go on
to the last edge). Axes that increase only. What was found out of the file is listed as \`inferred\`.

Faults of the description have pointers into it (/momentum/edges/3), faults of the file are at /values, or at /values/i/j for row i and
column j.`,
  body: 'crystal',
  multipart: { description: CrystalUpload, values: 'The file with the values.' },
  examples: {
    formFactor: {
      summary: 'A form factor with cells',
      value: {
        ...table,
        formFactorSquared: [
          [0.1, 0.2, 0.1],
          [0, 0.3, 0.2],
        ],
      },
    },
    lossFunction: {
      summary: 'A loss function sampled at points',
      value: {
        ...table,
        momentum: { unit: '1/angstrom', points: [0.5, 1, 2] },
        energy: { unit: 'eV', points: [2, 8, 16, 24] },
        lossFunction: [
          [0.01, 0.2, 2.5, 0.3],
          [0.01, 0.2, 1.5, 0.4],
          [0.01, 0.1, 0.5, 0.6],
        ],
      },
    },
    dielectricFunction: {
      summary: 'A dielectric function: its loss function and its imaginary part are at hand',
      value: {
        ...table,
        dielectricFunction: {
          real: [
            [12, -3, 0.5],
            [8, -1, 0.7],
          ],
          imaginary: [
            [0, 9, 0.6],
            [0, 5, 0.5],
          ],
        },
      },
    },
  },
  responses: {
    200: { description: 'The same table was already there.', schema: CrystalDescription },
    201: { description: 'Stored.', schema: CrystalDescription, headers: { Location: 'Where the table is.' } },
  },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy', 'storage-full'],
  async handle({ c, body, dependencies: { crystals, compute }, signal }) {
    negotiate(c, ['application/json']);
    const { momentumUnit, inferred, ...record } = body;
    // storing is not stopped when the caller leaves: a table is stored whole or not at all, and it is soon done
    const [{ created }, quality] = await Promise.all([
      crystals.add(record),
      qualityOf(record, compute, signal, momentumUnit),
    ]);
    c.header('Location', `/v1/crystals/${body.id}`);
    return c.json(
      { ...(await crystals.describe(body.id)), ...(inferred && { inferred }), quality },
      created ? 201 : 200,
    );
  },
});

export const listCrystals = defineRoute({
  method: 'get',
  path: '/v1/crystals',
  operationId: 'listCrystals',
  tag: 'crystals',
  summary: 'All tables: built-in ones first, then by name',
  responses: { 200: { description: 'Descriptions without values.', schema: CrystalList } },
  problems: ['not-acceptable', 'busy'],
  async handle({ c, dependencies: { crystals } }) {
    negotiate(c, ['application/json']);
    c.header('Cache-Control', 'no-cache');
    return c.json({ crystals: await crystals.list() });
  },
});

export const getCrystal = defineRoute({
  method: 'get',
  path: '/v1/crystals/{id}',
  operationId: 'describeCrystal',
  tag: 'crystals',
  summary: 'One table: axes, provenance, stated accuracy, quality report',
  parameters: { id: ID },
  responses: {
    200: { description: 'The description.', schema: CrystalDescription, headers: { ETag: 'The id of the table.' } },
  },
  problems: ['not-found', 'not-acceptable', 'busy'],
  async handle({ c, dependencies: { crystals, compute }, signal }) {
    negotiate(c, ['application/json']);
    const name = c.req.param('id')!;
    const record = await crystals.find(name);
    if (!record) throw unknownTable(name);
    const { headers, unchanged } = validatorsOf(c, record.id, crystals.isAlias(name), '');
    if (unchanged) return c.body(null, 304, headers);
    const description = await crystals.describe(record.id);
    const quality = await qualityOf(record, compute, signal);
    return c.json({ ...description, quality }, 200, headers);
  },
});

export const getCrystalValues = defineRoute({
  method: 'get',
  path: '/v1/crystals/{id}/values',
  operationId: 'downloadCrystal',
  tag: 'crystals',
  summary: 'A whole table, in a form in which it can be posted',
  description:
    'By Accept: the table in JSON; its values as .npy (float64, one row a momentum); or the values with both axes as CSV in matrix form.',
  parameters: { id: ID },
  responses: {
    200: {
      description: 'The table.',
      schema: CrystalValues,
      otherMediaTypes: ['application/octet-stream', 'text/csv'],
      headers: {
        ETag: 'The id of the table and its form.',
        'Content-Disposition': 'A name for the file: .npy and CSV.',
      },
    },
  },
  problems: ['not-found', 'not-acceptable', 'busy'],
  async handle({ c, dependencies: { crystals, compute }, signal }) {
    const name = c.req.param('id')!;
    const record = await crystals.find(name);
    if (!record) throw unknownTable(name);
    // two matrices have no form but JSON in which they could be posted again
    const isDielectric = record.header.quantity === 'dielectricFunction';
    const type = negotiate(c, isDielectric ? VALUES_TYPES.slice(0, 1) : VALUES_TYPES) as ValuesType;
    const { tag, ending } = VARIANTS[type];
    const validators = validatorsOf(c, record.id, crystals.isAlias(name), tag);
    const headers = { ...validators.headers, Vary: 'Accept' };
    if (validators.unchanged) return c.body(null, 304, headers);
    const signals = { first: signal, rest: c.req.raw.signal };
    const { body, length } = await valuesDownload(record, type, compute, signals);
    return c.body(body, 200, {
      ...headers,
      'Content-Type': type === 'text/csv' ? 'text/csv; charset=utf-8' : type,
      ...(ending === undefined ? {} : { 'Content-Disposition': `attachment; filename="${record.id}.${ending}"` }),
      ...(length === undefined ? {} : { 'Content-Length': String(length) }),
    });
  },
});

export const deleteCrystal = defineRoute({
  method: 'delete',
  path: '/v1/crystals/{id}',
  operationId: 'deleteCrystal',
  tag: 'crystals',
  summary: 'Delete an uploaded table',
  parameters: { id: ID },
  responses: { 204: { description: 'Deleted.' } },
  problems: ['not-found', 'in-use', 'busy'],
  async handle({ c, dependencies: { crystals } }) {
    const name = c.req.param('id')!;
    if (!(await crystals.remove(name))) throw unknownTable(name);
    return c.body(null, 204);
  },
});
