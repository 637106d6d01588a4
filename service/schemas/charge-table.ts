/** Tables of P(n|E), the user's own ionization model: inline in a scenario, or stored and named by id. */
import { z } from 'zod';
import { tableFaults } from '../../physics/ionization/table.ts';
import { QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';
import { contentOf, idOf } from '../crystals/crystal-record.ts';
import { KINDS, quantitiesOut } from './quantity.ts';

export interface ChargeTable {
  readonly energiesEv: readonly number[];
  /** A row an energy; column n − 1 holds P(n|E). */
  readonly probabilities: readonly (readonly number[])[];
}

/** What is stored of one: everything. */
export interface ChargeHeader extends ChargeTable {
  readonly name: string;
  readonly source?: string;
}

const MOST_ROWS = 5000;
const MOST_COLUMNS = 200;

/** Pointers of the calculation's faults in a charge table, whose energies stand in `energies/values` here. */
export function chargeTablePath(path: readonly (string | number)[]): (string | number)[] {
  return path[0] === 'energies' ? ['energies', 'values', ...path.slice(1)] : [...path];
}

const fields = {
  energies: z.strictObject({
    unit: z.string().meta({ examples: ['eV'], maxLength: 64 }),
    values: z.array(z.number()).max(MOST_ROWS),
  }),
  probabilities: z.array(z.array(z.number()).max(MOST_COLUMNS)).max(MOST_ROWS).meta({
    description:
      'One row an energy; its numbers are P(1|E), P(2|E), … A row sums to at most 1: what is missing is lost charge.',
  }),
};

interface Fields {
  readonly energies: { readonly unit: string; readonly values: readonly number[] };
  readonly probabilities: readonly (readonly number[])[];
}

/** The table in eV; what is wrong with it goes to the context. */
function readTable({ energies, probabilities }: Fields, context: z.RefinementCtx): ChargeTable {
  let factor = 1;
  try {
    factor = quantityOf(1, energies.unit, KINDS.energy);
  } catch (error) {
    if (!(error instanceof QuantityError)) throw error;
    context.addIssue({ code: 'custom', path: ['energies', 'unit'], message: error.message });
  }
  const table = { energiesEv: energies.values.map((value) => value * factor), probabilities };
  for (const { path, detail } of tableFaults({ ...table, bandGapEv: 0 })) {
    context.addIssue({ code: 'custom', path: chargeTablePath(path), message: detail });
  }
  return table;
}

export const InlineChargeTable = z
  .strictObject(fields)
  .meta({ id: 'InlineChargeTable', description: 'P(n|E), linear in E between rows; no charge outside the energies.' })
  .transform(readTable);

/** A charge table to be stored → its id and content. */
export const ChargeTableIn = z
  .strictObject({ name: z.string().min(1).max(200), source: z.string().max(5000).optional(), ...fields })
  .meta({
    id: 'ChargeTable',
    description: 'P(n|E), linear in E between rows; no charge outside the energies. The table has a name.',
  })
  .transform((input, context) => {
    const header: ChargeHeader = {
      name: input.name,
      ...(input.source === undefined ? {} : { source: input.source }),
      ...readTable(input, context),
    };
    const values = new Float64Array(0);
    return { id: idOf(contentOf(header, values)), header, values };
  });

export const ChargeTableOut = z
  .strictObject({
    id: z.string().meta({ description: 'SHA-256 of the canonical content, 64 hexadecimal digits.' }),
    name: z.string(),
    source: z.string().optional(),
    energies: quantitiesOut('eV'),
    probabilities: z.array(z.array(z.number())),
  })
  .meta({ id: 'StoredChargeTable' });

export const ChargeTableList = z
  .strictObject({
    chargeTables: z.array(z.strictObject({ id: z.string(), name: z.string(), source: z.string().optional() })),
  })
  .meta({ id: 'ChargeTableList' });
