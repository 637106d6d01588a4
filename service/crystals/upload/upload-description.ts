/** The description part of an uploaded table: what it says itself, and what it leaves to the values file. */
import { type Fault, pointerOf } from '../../problem.ts';
import { AxisNumbers, axisNumbersOf } from '../../schemas/crystal.ts';
import { MATRIX_FIELDS } from '../matrix.ts';
import { AXES, type AxisName, type DescribedAxis, type PerAxis } from './values-part.ts';

type Fields = Readonly<Record<string, unknown>>;
export type Quantity = (typeof MATRIX_FIELDS)[number];

export interface UploadDescription {
  /** The table's own fields, as they would stand beside its values in JSON. */
  readonly table: Fields;
  readonly quantity: Quantity;
  readonly dataset: string | undefined;
  readonly axisDatasets: Partial<PerAxis<string>>;
  /** The axes that are given in full. */
  readonly described: PerAxis<DescribedAxis | undefined>;
  readonly faults: readonly Fault[];
}

/** Faults are collected: those of the values are to be told at the same time. */
export function uploadDescription(json: Fields): UploadDescription {
  const { quantity, dataset, ...rest } = json;
  const table: Record<string, unknown> = rest;
  const faults: Fault[] = [];
  for (const field of [...MATRIX_FIELDS, 'dielectricFunction']) {
    if (!Object.hasOwn(table, field)) continue;
    faults.push({ pointer: pointerOf([field]), detail: 'belongs into the part "values"' });
    delete table[field];
  }
  const axisDatasets: Partial<Record<AxisName, string>> = {};
  for (const name of AXES) {
    const axis = table[name];
    if (!isFields(axis) || !Object.hasOwn(axis, 'dataset')) continue;
    const { dataset: path, ...others } = axis;
    table[name] = others;
    const pointer = pointerOf([name, 'dataset']);
    if (others['edges'] !== undefined || others['points'] !== undefined)
      faults.push({ pointer, detail: 'stands in the place of "edges" and "points", not beside them' });
    axisDatasets[name] = pathOf(path, pointer, faults);
  }
  return {
    table,
    quantity: quantityOf(quantity, faults),
    dataset: dataset === undefined ? undefined : pathOf(dataset, '/dataset', faults),
    axisDatasets,
    described: { momentum: describedAxis(table['momentum']), energy: describedAxis(table['energy']) },
    faults,
  };
}

export function isFields(value: unknown): value is Fields {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}

function quantityOf(value: unknown, faults: Fault[]): Quantity {
  const known = MATRIX_FIELDS.find((field) => field === (value ?? MATRIX_FIELDS[0]));
  if (known && value !== null) return known;
  const detail =
    value === 'dielectricFunction'
      ? `cannot be "dielectricFunction": its two matrices go in a table in JSON, or Im[−1/ε] in a file as "lossFunction"`
      : `must be one of ${MATRIX_FIELDS.map((field) => `"${field}"`).join(', ')}`;
  faults.push({ pointer: '/quantity', detail });
  return MATRIX_FIELDS[0];
}

function pathOf(value: unknown, pointer: string, faults: Fault[]): string {
  if (typeof value === 'string' && value !== '' && value.length <= 1000 && !value.includes('\0')) return value;
  faults.push({ pointer, detail: 'must be the path of a dataset in an HDF5 file, such as "/table/values"' });
  return '/';
}

function describedAxis(value: unknown): DescribedAxis | undefined {
  if (!isFields(value)) return undefined;
  const given = (['edges', 'points'] as const).filter((kind) => value[kind] !== undefined);
  if (given.length !== 1) return undefined;
  const read = AxisNumbers.safeParse(value[given[0]]);
  if (!read.success) return undefined;
  const unit = typeof value['unit'] === 'string' ? { unit: value['unit'] } : {};
  return { kind: given[0], numbers: axisNumbersOf(read.data), ...unit };
}
