import { Problem } from '../problem.ts';
import { defineRoute, negotiate } from '../route.ts';
import { type ChargeHeader, ChargeTableList, ChargeTableOut } from '../schemas/charge-table.ts';

const ID = 'SHA-256 of the table.';

function out(id: string, { name, source, energiesEv, probabilities }: ChargeHeader) {
  return {
    id,
    name,
    ...(source === undefined ? {} : { source }),
    energies: { unit: 'eV', values: energiesEv },
    probabilities,
  };
}

function unknownTable(id: string): Problem {
  return new Problem('not-found', `No charge table has the id "${id}"; GET /v1/charge-tables lists them.`);
}

export const postChargeTable = defineRoute({
  method: 'post',
  path: '/v1/charge-tables',
  operationId: 'storeChargeTable',
  tag: 'charge tables',
  summary: 'Store a table of P(n|E), an ionization model of one’s own',
  body: 'chargeTable',
  examples: {
    threeElectrons: {
      summary: 'Invented numbers that lose a little charge',
      value: {
        name: 'Invented numbers',
        energies: { unit: 'eV', values: [1.2, 4, 8, 12] },
        probabilities: [
          [1, 0, 0],
          [0.9, 0.08, 0],
          [0.1, 0.8, 0.08],
          [0, 0.2, 0.75],
        ],
      },
    },
  },
  responses: {
    200: { description: 'The same table was already there.', schema: ChargeTableOut },
    201: { description: 'Stored.', schema: ChargeTableOut, headers: { Location: 'Where the table is.' } },
  },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy', 'storage-full'],
  async handle({ c, body, dependencies: { chargeTables } }) {
    negotiate(c, ['application/json']);
    const { created } = await chargeTables.put(body);
    c.header('Location', `/v1/charge-tables/${body.id}`);
    return c.json(out(body.id, body.header), created ? 201 : 200);
  },
});

export const listChargeTables = defineRoute({
  method: 'get',
  path: '/v1/charge-tables',
  operationId: 'listChargeTables',
  tag: 'charge tables',
  summary: 'All charge tables, by name',
  responses: { 200: { description: 'Their names.', schema: ChargeTableList } },
  problems: ['not-acceptable', 'busy'],
  async handle({ c, dependencies: { chargeTables } }) {
    negotiate(c, ['application/json']);
    const tables = [...(await chargeTables.list())].sort((a, b) => (a.header.name < b.header.name ? -1 : 1));
    c.header('Cache-Control', 'no-cache');
    return c.json({
      chargeTables: tables.map(({ id, header: { name, source } }) => ({
        id,
        name,
        ...(source === undefined ? {} : { source }),
      })),
    });
  },
});

export const getChargeTable = defineRoute({
  method: 'get',
  path: '/v1/charge-tables/{id}',
  operationId: 'getChargeTable',
  tag: 'charge tables',
  summary: 'One charge table, whole',
  parameters: { id: ID },
  responses: { 200: { description: 'The table.', schema: ChargeTableOut } },
  problems: ['not-found', 'not-acceptable', 'busy'],
  async handle({ c, dependencies: { chargeTables } }) {
    negotiate(c, ['application/json']);
    const id = c.req.param('id')!;
    const record = await chargeTables.get(id);
    if (!record) throw unknownTable(id);
    c.header('ETag', `"${id}"`);
    c.header('Cache-Control', 'public, max-age=31536000, immutable');
    return c.json(out(id, record.header));
  },
});

export const deleteChargeTable = defineRoute({
  method: 'delete',
  path: '/v1/charge-tables/{id}',
  operationId: 'deleteChargeTable',
  tag: 'charge tables',
  summary: 'Delete a charge table',
  parameters: { id: ID },
  responses: { 204: { description: 'Deleted.' } },
  problems: ['not-found', 'busy'],
  async handle({ c, dependencies: { chargeTables } }) {
    const id = c.req.param('id')!;
    if (!(await chargeTables.remove(id))) throw unknownTable(id);
    return c.body(null, 204);
  },
});
