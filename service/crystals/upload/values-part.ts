/** What every reader of a values file gives, and how each says what is wrong with the file. */
import type { AxisKind } from '../../../physics/crystal/crystal-table.ts';
import { type Fault, invalidInput, MOST_FAULTS, type Problem } from '../../problem.ts';
import type { PackedMatrix } from '../matrix.ts';

/** As .npy of float64 a table of this size can be posted again. */
export const MOST_VALUES = 30_000_000;
/** Numbers an axis may have, as in JSON. */
export const MOST_AXIS_NUMBERS = 100_000;

/** An axis as the description gives it, in the unit that it names there. */
export interface DescribedAxis {
  readonly kind: AxisKind;
  readonly numbers: readonly number[];
  readonly unit?: string;
}

/** An axis that the description leaves to the file, in the unit that the file names, if it does. */
export type FileAxis = DescribedAxis;

export const AXES = ['momentum', 'energy'] as const;
export type AxisName = (typeof AXES)[number];
export type PerAxis<T> = Readonly<Record<AxisName, T>>;

export interface ReadValues {
  readonly matrix: PackedMatrix;
  /** Those that the file gave. */
  readonly axes: Partial<PerAxis<FileAxis>>;
  /** What was found out rather than said, one sentence each. */
  readonly inferred: readonly string[];
}

/** The values part is faulty. */
export function faultyValues(detail: string, place: readonly number[] = []): Problem {
  return invalidInput([{ pointer: `/values${place.map((index) => `/${index}`).join('')}`, detail }]);
}

export function cellsOf({ kind, numbers }: DescribedAxis): number {
  return kind === 'edges' ? numbers.length - 1 : numbers.length;
}

/** Refuses a shape that the axes do not make, or one too large to hold, before anything is allocated for it. */
export function requireShape(rows: number, columns: number, axes: PerAxis<DescribedAxis | undefined>): void {
  const is = `has the shape ${rows} × ${columns}`;
  const [expectedRows, expectedColumns] = [axes.momentum, axes.energy].map((axis) => axis && cellsOf(axis));
  if ((expectedRows ?? rows) !== rows || (expectedColumns ?? columns) !== columns) {
    const transposed = expectedRows === columns && expectedColumns === rows;
    const hint = transposed ? '; turned over it would fit: one row a momentum, one column an energy' : '';
    throw faultyValues(`${is}; the axes make ${expectedRows ?? rows} × ${expectedColumns ?? columns}${hint}`);
  }
  if (rows < 2 || columns < 2) throw faultyValues(`${is}; a table has at least 2 × 2 values`);
  if (rows * columns > MOST_VALUES) throw faultyValues(`${is}; a table has at most ${MOST_VALUES} values`);
  if (rows > MOST_AXIS_NUMBERS || columns > MOST_AXIS_NUMBERS)
    throw faultyValues(`${is}; an axis has at most ${MOST_AXIS_NUMBERS} numbers`);
}

/** A table's numbers while they are read: `values` is filled by the reader, `refuse` takes note of what it cannot fill. */
export interface MatrixInProgress {
  readonly values: Float64Array;
  refuse(index: number, detail: string): void;
  done(): PackedMatrix;
}

export function matrixInProgress(rows: number, columns: number): MatrixInProgress {
  const values = new Float64Array(new SharedArrayBuffer(8 * rows * columns));
  const faults: Required<Pick<Fault, 'pointer' | 'detail'>>[] = [];
  let faultCount = 0;
  return {
    values,
    refuse(index, detail) {
      if (++faultCount > MOST_FAULTS) return;
      faults.push({ pointer: `/${Math.floor(index / columns)}/${index % columns}`, detail });
    },
    done: () => ({ packed: true, rowLengths: new Int32Array(rows).fill(columns), values, faults, faultCount }),
  };
}

/** Why a number that is not in [0, ∞) is refused. */
export function refusalOf(value: number): string {
  if (Number.isFinite(value)) return `must be a number of at least 0; got ${value}`;
  return `must be a number of at least 0; got ${Number.isNaN(value) ? 'one that is none' : 'one beyond all that can be held'}`;
}
