/**
 * A values file as text, in one of three forms that are told apart by what is in them:
 *
 *   long     three columns, momentum, energy, value, the rows in any order; a header row may name them
 *   matrix   the first row energies behind a corner cell, the first column momenta; for cells, both go on to the last edge, and
 *            the cells of the last row and of the last column are empty
 *   bare     nothing but the values, where the description gives both axes
 *
 * A header or a corner may carry units, as in `momentum (keV)`.
 */
import type { AxisKind } from '../../../physics/crystal/crystal-table.ts';
import { KINDS, QuantityError, quantityOf } from '../../../physics/quantity/quantity.ts';
import { type CsvRows, csvRows, DELIMITERS, numberIn } from './csv-rows.ts';
import type { OpenFile } from './file-blocks.ts';
import {
  AXES,
  type AxisName,
  cellsOf,
  type DescribedAxis,
  type FileAxis,
  faultyValues,
  type MatrixInProgress,
  MOST_AXIS_NUMBERS,
  matrixInProgress,
  type PerAxis,
  type ReadValues,
  refusalOf,
  requireShape,
} from './values-part.ts';

type Described = PerAxis<DescribedAxis | undefined>;

/** What a file's own axis may differ by from the description's, relative: it may have been printed with six digits. */
const SAME = 2e-6;
/** The names of an axis, and the unit in brackets behind it. */
const NAMES: PerAxis<RegExp> = {
  momentum: /(?<![a-z])(?:q|k|momentum)(?![a-z])[^()[\]]*(?:[([]([^()[\]]+)[)\]])?/i,
  energy: /(?<![a-z])(?:e|w|ω|omega|energy)(?![a-z])[^()[\]]*(?:[([]([^()[\]]+)[)\]])?/i,
};

export function readCsv(file: OpenFile, described: Described): ReadValues {
  const csv = csvRows(file);
  const first: readonly string[] = csv.rows().next().value ?? [];
  const separated = `values: text separated by ${DELIMITERS[csv.delimiter]}`;
  const numbers = first.map(numberIn);
  const allNumbers = numbers.every((number) => number !== undefined);
  const [rows, columns] = AXES.map((name) => described[name] && cellsOf(described[name]));
  if (allNumbers && rows !== undefined && columns === first.length && surveyOf(csv).height === rows)
    return readBare(csv, rows, columns, `${separated}, the bare matrix`);
  const named = first.every((cell, i) => cell !== '' && numbers[i] === undefined);
  if (first.length === 3 && (allNumbers || named))
    return readLong(csv, described, named ? first : undefined, separated);
  if (first.length >= 3 && numbers.slice(1).every((number) => number !== undefined))
    return readMatrix(csv, described, separated);
  throw faultyValues(
    'is neither in long form (three columns: momentum, energy, value) nor in matrix form (first row energies, first column momenta)',
  );
}

/** How many rows there are, and the last. */
function surveyOf(csv: CsvRows): { height: number; last: readonly string[] } {
  let [height, last] = [0, [] as readonly string[]];
  for (const row of csv.rows()) {
    height++;
    last = row;
  }
  return { height, last };
}

/** Takes a cell into the matrix, or takes note of what is wrong with it. */
function put(matrix: MatrixInProgress, index: number, cell: string): void {
  const value = numberIn(cell);
  if (value === undefined)
    matrix.refuse(index, `must be a number of at least 0; got ${cell === '' ? 'nothing' : 'text'}`);
  else if (value >= 0 && value < Infinity)
    matrix.values[index] = value + 0; // −0 is 0
  else matrix.refuse(index, refusalOf(value));
}

function putRow(matrix: MatrixInProgress, i: number, cells: readonly string[], columns: number): void {
  if (cells.length !== columns) throw faultyValues(`has ${cells.length} numbers; the first row makes ${columns}`, [i]);
  for (let j = 0; j < columns; j++) put(matrix, i * columns + j, cells[j]);
}

function readBare(csv: CsvRows, rows: number, columns: number, how: string): ReadValues {
  const matrix = matrixInProgress(rows, columns);
  let i = 0;
  for (const row of csv.rows()) putRow(matrix, i++, row, columns);
  return { matrix: matrix.done(), axes: {}, inferred: [`${how} of ${rows} × ${columns}`] };
}

function readMatrix(csv: CsvRows, described: Described, separated: string): ReadValues {
  const { height, last } = surveyOf(csv);
  const kind: AxisKind = last.slice(1).every((cell) => cell === '') ? 'edges' : 'points';
  const less = kind === 'edges' ? 1 : 0;
  const [corner, ...energyCells] = csv.rows().next().value as string[];
  const [rows, columns] = [height - 1 - less, energyCells.length - less];
  requireShape(rows, columns, described);
  const energy = energyCells.map((cell) => axisNumber('energy', cell));
  const momentum: number[] = [];
  const matrix = matrixInProgress(rows, columns);
  for (const [first, ...cells] of csv.rows()) {
    const i = momentum.length - 1;
    momentum.push(i < 0 ? Number.NaN : axisNumber('momentum', first));
    if (i < 0 || i === rows) continue; // the energies, or the last edge
    if (less === 1 && cells.length > columns && cells.pop() !== '')
      throw faultyValues('has a number behind the last edge of energy', [i]);
    putRow(matrix, i, cells, columns);
  }
  momentum.shift();
  const axes = fileAxes({ momentum, energy }, kind, described, { momentum: corner, energy: corner });
  return {
    matrix: matrix.done(),
    axes,
    inferred: [`${separated}, in matrix form of ${rows} × ${columns}`, ...sentencesOf(axes)],
  };
}

function readLong(
  csv: CsvRows,
  described: Described,
  header: readonly string[] | undefined,
  separated: string,
): ReadValues {
  const place = placesOf(header);
  const read = (row: readonly string[], name: AxisName): number => {
    if (row.length === 3) return axisNumber(name, row[place[name]]);
    throw faultyValues(`has a row of ${row.length} cells; in long form every row has three`);
  };
  const numbers = distinctNumbers(csv, header !== undefined, read);
  const [rows, columns] = [numbers.momentum.length, numbers.energy.length];
  requireShape(rows, columns, described);
  const axes = fileAxes(numbers, 'points', described, {
    momentum: header?.[place.momentum] ?? '',
    energy: header?.[place.energy] ?? '',
  });
  const [rowOf, columnOf] = AXES.map((name) => new Map(numbers[name].map((number, i) => [number, i])));
  const matrix = matrixInProgress(rows, columns);
  const seen = new Uint8Array(rows * columns);
  for (const row of dataRows(csv, header !== undefined)) {
    const index = rowOf.get(read(row, 'momentum'))! * columns + columnOf.get(read(row, 'energy'))!;
    if (seen[index]++ === 1) matrix.refuse(index, 'is there twice');
    else put(matrix, index, row[place.value]);
  }
  seen.forEach((times, index) => {
    if (times > 0) return;
    const [q, e] = [numbers.momentum[Math.floor(index / columns)], numbers.energy[index % columns]];
    matrix.refuse(index, `is missing: no row has momentum ${q} and energy ${e}`);
  });
  const order = `column ${place.momentum + 1} read as momentum, ${place.energy + 1} as energy, ${place.value + 1} as value`;
  return {
    matrix: matrix.done(),
    axes,
    inferred: [`${separated}, in long form of ${rows} × ${columns}: ${order}`, ...sentencesOf(axes)],
  };
}

function* dataRows(csv: CsvRows, hasHeader: boolean): Generator<readonly string[]> {
  const rows = csv.rows();
  if (hasHeader) rows.next();
  yield* rows;
}

/** Which column is which: by the header where it names both axes, else in the order of the contract. */
function placesOf(header: readonly string[] | undefined): Readonly<Record<AxisName | 'value', number>> {
  const [momentum, energy] = AXES.map((name) =>
    (header ?? []).findIndex((cell) => NAMES[name].exec(cell)?.index === 0),
  );
  if (momentum < 0 || energy < 0 || momentum === energy) return { momentum: 0, energy: 1, value: 2 };
  return { momentum, energy, value: 3 - momentum - energy };
}

/** The numbers of both axes in increasing order. A first pass for these alone keeps a long file out of memory. */
function distinctNumbers(
  csv: CsvRows,
  hasHeader: boolean,
  read: (row: readonly string[], name: AxisName) => number,
): PerAxis<number[]> {
  const sets = { momentum: new Set<number>(), energy: new Set<number>() };
  for (const row of dataRows(csv, hasHeader)) {
    for (const name of AXES) {
      sets[name].add(read(row, name));
      if (sets[name].size > MOST_AXIS_NUMBERS) throw faultyValues(`has over ${MOST_AXIS_NUMBERS} values of ${name}`);
    }
  }
  const sorted = (set: Set<number>): number[] => [...set].sort((a, b) => a - b);
  return { momentum: sorted(sets.momentum), energy: sorted(sets.energy) };
}

function axisNumber(name: AxisName, cell: string): number {
  const number = numberIn(cell);
  if (number === undefined || !Number.isFinite(number)) throw faultyValues(`has a cell of ${name} that is no number`);
  return number + 0;
}

/** The axes that the file gives and the description does not; those that both give must agree. */
function fileAxes(
  numbers: PerAxis<readonly number[]>,
  kind: AxisKind,
  described: Described,
  labels: PerAxis<string>,
): Partial<Record<AxisName, FileAxis>> {
  const axes: Partial<Record<AxisName, FileAxis>> = {};
  for (const name of AXES) {
    const given = described[name];
    const unit = NAMES[name].exec(labels[name])?.[1];
    if (given) requireAgreement(name, inUnitOf(name, numbers[name], unit, given.unit), given);
    else axes[name] = { kind, numbers: numbers[name], ...(unit === undefined ? {} : { unit }) };
  }
  return axes;
}

/** The file's numbers in the description's unit, where the two name different ones. */
function inUnitOf(
  name: AxisName,
  numbers: readonly number[],
  unit: string | undefined,
  wanted: string | undefined,
): readonly number[] {
  if (unit === undefined || wanted === undefined || unit === wanted) return numbers;
  try {
    const ratio = quantityOf(1, unit, KINDS[name]) / quantityOf(1, wanted, KINDS[name]);
    return numbers.map((number) => number * ratio);
  } catch (error) {
    if (error instanceof QuantityError)
      throw faultyValues(`${name}: the file has it in ${unit}, the description in ${wanted}`);
    throw error;
  }
}

function requireAgreement(name: AxisName, numbers: readonly number[], { kind, numbers: given }: DescribedAxis): void {
  const isSame = (a: number, b: number): boolean => Math.abs(a - b) <= SAME * Math.max(Math.abs(a), Math.abs(b));
  const inCell = (x: number, i: number): boolean =>
    (x >= given[i] && x <= given[i + 1]) || isSame(x, given[i]) || isSame(x, given[i + 1]);
  const whole = kind === 'points' || numbers.length === given.length;
  numbers.forEach((x, i) => {
    if (whole ? isSame(x, given[i]) : inCell(x, i)) return;
    const there = whole ? `${given[i]}` : `a cell from ${given[i]} to ${given[i + 1]}`;
    throw faultyValues(`has ${x} as ${name} number ${i}, where the description has ${there}`);
  });
}

function sentencesOf(axes: Partial<Record<AxisName, FileAxis>>): string[] {
  return AXES.flatMap((name) => {
    const axis = axes[name];
    if (!axis) return [];
    return [
      `${name}: ${axis.numbers.length} ${axis.kind} from the file${axis.unit === undefined ? '' : `, in ${axis.unit}`}`,
    ];
  });
}
