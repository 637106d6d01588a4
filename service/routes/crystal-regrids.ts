import type { CrystalRecord } from '../crystals/crystal-record.ts';
import { shapeOf } from '../crystals/crystal-record.ts';
import { type Fault, invalidInput } from '../problem.ts';
import { qualityOf } from '../quality-reports.ts';
import { defineRoute, negotiate } from '../route.ts';
import { CrystalDescription } from '../schemas/crystal.ts';
import type { CrystalRegrid } from '../schemas/crystal-regrids.ts';
import { unknownTable } from './crystals.ts';

export const crystalRegrids = defineRoute({
  method: 'post',
  path: '/v1/crystals/{id}/regrids',
  operationId: 'regridCrystal',
  tag: 'crystals',
  summary: 'Store the same table with fewer cells',
  description:
    'For tables too fine to serve fast. Integrals over cells are conserved, so the f-sum rule is; rates change in second order of the ' +
    'cells’ width: POST …/comparisons tells by how much. A table of points becomes one of cells.',
  parameters: { id: 'SHA-256 of the table, or the alias of a built-in one.' },
  parameterExamples: { id: 'silicon' },
  body: 'crystalRegrid',
  examples: {
    half: { summary: 'Half as many cells on either axis', value: { momentumCells: 360, energyCells: 250 } },
  },
  responses: {
    200: { description: 'The same table was already there.', schema: CrystalDescription },
    201: { description: 'Stored.', schema: CrystalDescription, headers: { Location: 'Where the table is.' } },
  },
  problems: [
    'malformed-body',
    'not-found',
    'not-acceptable',
    'too-large',
    'media-type',
    'invalid-input',
    'busy',
    'storage-full',
  ],
  async handle({ c, body, dependencies: { crystals, compute }, signal }) {
    negotiate(c, ['application/json']);
    const name = c.req.param('id')!;
    const record = await crystals.find(name);
    if (!record) throw unknownTable(name);
    refuseMore(record, body);
    const fresh = await crystals.using(record.id, () => compute.run('regrid', { record, cells: body }, { signal }));
    const { created } = fresh.id === record.id ? { created: false } : await crystals.add(fresh);
    const quality = await qualityOf(fresh, compute, signal);
    c.header('Location', `/v1/crystals/${fresh.id}`);
    return c.json({ ...(await crystals.describe(fresh.id)), quality }, created ? 201 : 200);
  },
});

/** Cells are merged, never split: finer ones would add nothing but size. */
function refuseMore({ header }: CrystalRecord, body: CrystalRegrid): void {
  const { rows, columns } = shapeOf(header);
  const less = header.axes === 'edges' ? 0 : 1; // N points make N − 1 cells
  if (header.quantity === 'dielectricFunction') {
    const detail =
      'the table holds a dielectric function: the loss function of a mean is not the mean of the loss function';
    throw invalidInput([{ parameter: 'id', detail }]);
  }
  const faults: Fault[] = [];
  const check = (field: 'momentumCells' | 'energyCells', has: number): void => {
    if (has < 2)
      faults.push({ pointer: `/${field}`, detail: `the table has ${has + 1} points, too few for two cells` });
    else if ((body[field] ?? has) > has)
      faults.push({ pointer: `/${field}`, detail: `is more than the ${has} cells that the table has` });
  };
  check('momentumCells', rows - less);
  check('energyCells', columns - less);
  if (faults.length > 0) throw invalidInput(faults);
}
