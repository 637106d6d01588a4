/** A table out of datasets of an HDF5 file. Runs in a thread of its own (hdf5-thread). */
import fs from 'node:fs';
import type { Dataset } from 'h5wasm';
import { invalidInput, type Problem } from '../../problem.ts';
import { type Hdf5Library, type OpenHdf5, openHdf5 } from './hdf5-library.ts';
import {
  AXES,
  type AxisName,
  type DescribedAxis,
  type FileAxis,
  faultyValues,
  MOST_AXIS_NUMBERS,
  MOST_VALUES,
  matrixInProgress,
  type PerAxis,
  type ReadValues,
  refusalOf,
  requireShape,
} from './values-part.ts';

export interface Hdf5Job {
  readonly file: string;
  /** Path of the values; where there is none, the only dataset of two dimensions. */
  readonly dataset: string | undefined;
  /** Paths of the axes that the description leaves to the file. */
  readonly axisDatasets: Partial<PerAxis<string>>;
  readonly described: PerAxis<DescribedAxis | undefined>;
}

/** Numbers read at once: what the library holds beside the table. */
const BLOCK_NUMBERS = 2 ** 18;
/** Entries of a file that are looked at in search of the table. */
const MOST_PATHS = 10_000;
const FLOAT_CLASS = 1;

export async function readDatasets(job: Hdf5Job): Promise<ReadValues> {
  const descriptor = fs.openSync(job.file, 'r');
  try {
    const opened = await openHdf5({ descriptor, size: fs.fstatSync(descriptor).size });
    if (!opened) throw faultyValues('cannot be read as HDF5');
    return tableIn(opened, job);
  } finally {
    fs.closeSync(descriptor);
  }
}

function tableIn(opened: OpenHdf5, job: Hdf5Job): ReadValues {
  const inferred: string[] = [];
  const path = job.dataset ?? onlyTable(opened);
  const dataset = numbersAt(opened, path, '/dataset', 2);
  const { shape, size, littleEndian } = dataset.metadata;
  const [rows, columns] = shape as [number, number];
  const axes: Partial<Record<AxisName, FileAxis>> = {};
  for (const [k, name] of AXES.entries()) {
    const axisPath = job.axisDatasets[name];
    if (axisPath === undefined) continue;
    axes[name] = axisAt(opened, axisPath, name, k === 0 ? rows : columns);
    inferred.push(`${name}: ${axes[name].numbers.length} ${axes[name].kind}, by the length of the dataset`);
  }
  const { momentum, energy } = { ...job.described, ...axes };
  requireShape(rows, columns, { momentum, energy });
  const matrix = matrixInProgress(rows, columns);
  let index = 0;
  for (const block of blocksOf(dataset, opened)) {
    for (const value of block) {
      if (value >= 0 && value < Infinity)
        matrix.values[index] = value + 0; // −0 is 0
      else matrix.refuse(index, refusalOf(value));
      index++;
    }
  }
  const which = job.dataset === undefined ? `, the only table in the file (${path})` : '';
  const type = `float${8 * size}${littleEndian ? '' : ', big endian'}`;
  return {
    matrix: matrix.done(),
    axes,
    inferred: [`values: HDF5 of ${type}, ${rows} × ${columns}${which}`, ...inferred],
  };
}

/** The only dataset of two dimensions, where the description names none. */
function onlyTable({ file, h5 }: OpenHdf5): string {
  const tables = file
    .paths()
    .slice(0, MOST_PATHS)
    .map((path) => path.replace(/^\/*/, '/'))
    .filter((path) => {
      const entry = file.get(path);
      return entry instanceof h5.Dataset && entry.metadata.shape?.length === 2;
    });
  if (tables.length === 1) return tables[0];
  const found = tables.length === 0 ? 'none' : `${tables.length}, as ${tables.slice(0, 3).map((path) => `"${path.slice(0, 100)}"`).join(', ')}`; // biome-ignore format: one line
  throw invalidInput([
    {
      pointer: '/dataset',
      detail: `is needed: the path of the values in the file, which has ${found} of two dimensions`,
    },
  ]);
}

/** A dataset of real numbers, checked for all that could make reading it more than reading it. */
function numbersAt({ file, h5 }: OpenHdf5, path: string, pointer: string, dimensions: number): Dataset {
  const refuse = (detail: string): Problem => invalidInput([{ pointer, detail }]);
  const entry = file.get(path);
  if (!(entry instanceof h5.Dataset)) throw refuse('names no dataset of the file');
  const { shape, type, size, vlen, chunks, virtual_sources: sources } = entry.metadata;
  if (type !== FLOAT_CLASS || vlen || (size !== 4 && size !== 8))
    throw refuse('names a dataset that is not of float32 or float64');
  if (shape?.length !== dimensions)
    throw refuse(`names a dataset of ${shape?.length ?? 0} dimensions; must have ${dimensions}`);
  if (sources !== undefined && sources.length > 0)
    throw refuse('names a virtual dataset, whose numbers are in other files');
  if (chunks && chunks.reduce((a, b) => a * b, 1) > MOST_VALUES)
    throw refuse('names a dataset in chunks that are too large');
  return entry;
}

function axisAt(opened: OpenHdf5, path: string, name: AxisName, cells: number): FileAxis {
  const pointer = `/${name}/dataset`;
  const dataset = numbersAt(opened, path, pointer, 1);
  const [length] = dataset.metadata.shape as [number];
  if (length !== cells && length !== cells + 1) {
    const detail = `has ${length} numbers; the values make ${cells} points or ${cells + 1} edges`;
    throw invalidInput([{ pointer, detail }]);
  }
  if (length > MOST_AXIS_NUMBERS + 1)
    throw invalidInput([{ pointer, detail: `has ${length} numbers; an axis has at most ${MOST_AXIS_NUMBERS}` }]);
  const numbers = [...blocksOf(dataset, opened)].flatMap((block) => Array.from(block));
  return { kind: length === cells ? 'points' : 'edges', numbers };
}

/**
 * A dataset's numbers, whole rows at a time and whole chunks where it has them, lest each be unpacked again and again. Reads
 * through the library itself: the package's own slice() takes what lay in memory for numbers where a chunk cannot be read.
 */
function* blocksOf(dataset: Dataset, { library }: OpenHdf5): Generator<Float32Array | Float64Array> {
  const { shape, size, chunks } = dataset.metadata;
  const [rows, columns = 1] = shape!;
  const chunkRows = chunks?.[0] ?? 1;
  const together = Math.max(1, Math.floor(BLOCK_NUMBERS / columns / chunkRows)) * chunkRows;
  for (let from = 0; from < rows; from += together) {
    const count = Math.min(together, rows - from);
    yield blockOf(library, dataset, shape!.length === 1 ? [count] : [count, columns], from, size);
  }
}

function blockOf(
  library: Hdf5Library,
  { file_id, path }: Dataset,
  count: readonly number[],
  from: number,
  size: number,
): Float32Array | Float64Array {
  const bytes = count.reduce((a, b) => a * b, size);
  const pointer = library._malloc(bytes);
  if (pointer === 0) throw faultyValues('needs more memory than there is to be read');
  try {
    const offset = count.map((_, k) => BigInt(k === 0 ? from : 0));
    const strides = count.map(() => 1n);
    const status = library.get_dataset_data(file_id, path, count.map(BigInt), offset, strides, BigInt(pointer));
    if (status < 0) throw faultyValues('cannot be read as HDF5: its data are damaged or packed in an unknown way');
    const block = library.HEAPU8.slice(pointer, pointer + bytes).buffer; // little endian, whatever the file has
    return size === 8 ? new Float64Array(block) : new Float32Array(block);
  } finally {
    library._free(pointer);
  }
}
