/**
 * A table's numbers, packed out of JSON rows into one shared typed array before anything else looks at the body: schema
 * validation of half a million numbers one by one would cost more than the rate they are for.
 */
import type { Fault } from '../problem.ts';
import { MOST_FAULTS } from '../problem.ts';
import { scenarioPlaces } from '../schemas/scenario-places.ts';

export interface PackedMatrix {
  readonly packed: true;
  readonly rowLengths: Int32Array;
  /** Row after row, on shared memory; only complete when there are no faults. */
  readonly values: Float64Array;
  /** The first offenders, with pointers relative to the matrix, and how many there were in all. */
  readonly faults: readonly Required<Pick<Fault, 'pointer' | 'detail'>>[];
  readonly faultCount: number;
}

export const MATRIX_FIELDS = ['formFactorSquared', 'lossFunction'] as const;

/** The two matrices of a dielectric function, and whether their numbers may be negative. */
export const DIELECTRIC_PARTS = [
  ['real', true],
  ['imaginary', false],
] as const;

export function isPackedMatrix(value: unknown): value is PackedMatrix {
  return typeof value === 'object' && value !== null && (value as { packed?: unknown }).packed === true;
}

/** Packs an array of rows of numbers, each finite and (if so asked) at least 0; collects what is not. Anything else comes back as it is. */
function packMatrix(rows: unknown, mayBeNegative = false): unknown {
  if (!Array.isArray(rows)) return isPackedMatrix(rows) ? { packed: false } : rows;
  const form = mayBeNegative ? 'must be a finite number' : 'must be a number of at least 0';
  const faults: { pointer: string; detail: string }[] = [];
  let faultCount = 0;
  const fault = (pointer: string, detail: string): void => {
    faultCount++;
    if (faults.length < MOST_FAULTS) faults.push({ pointer, detail });
  };
  const rowLengths = Int32Array.from(rows, (row: unknown) => (Array.isArray(row) ? row.length : -1));
  const size = rowLengths.reduce((sum, length) => sum + Math.max(0, length), 0);
  const values = new Float64Array(new SharedArrayBuffer(8 * size));
  let at = 0;
  rows.forEach((row: unknown, i) => {
    if (!Array.isArray(row)) {
      fault(`/${i}`, 'must be a row of numbers, one for each energy');
      return;
    }
    for (let j = 0; j < row.length; j++, at++) {
      const value: unknown = row[j];
      if (typeof value !== 'number') fault(`/${i}/${j}`, `${form}; got ${kindOf(value)}`);
      else if (!(Math.abs(value) < Infinity)) fault(`/${i}/${j}`, `${form}; got one beyond all that can be held`);
      else if (!mayBeNegative && !(value >= 0)) fault(`/${i}/${j}`, `${form}; got ${value}`);
      else values[at] = value + 0; // −0 is 0, or the same table would have two ids
    }
  });
  return { packed: true, rowLengths, values, faults, faultCount } satisfies PackedMatrix;
}

function kindOf(value: unknown): string {
  if (value === null) return 'null';
  return Array.isArray(value) ? 'a list' : `a ${typeof value}`;
}

function packParts(parts: Record<string, unknown>): void {
  for (const [part, mayBeNegative] of DIELECTRIC_PARTS)
    if (Object.hasOwn(parts, part)) parts[part] = packMatrix(parts[part], mayBeNegative);
}

/** Replaces every matrix in a request body (a table, or a table inline in a scenario) by its packed form, in place. */
export function packTables(body: unknown): void {
  for (const { scenario } of scenarioPlaces(body)) {
    for (const holder of [scenario, scenario['crystal']].flat()) {
      if (typeof holder !== 'object' || holder === null) continue;
      const table = holder as Record<string, unknown>;
      for (const field of MATRIX_FIELDS) if (Object.hasOwn(table, field)) table[field] = packMatrix(table[field]);
      const parts = Object.hasOwn(table, 'dielectricFunction') ? table['dielectricFunction'] : undefined;
      if (typeof parts === 'object' && parts !== null) packParts(parts as Record<string, unknown>);
    }
  }
}
