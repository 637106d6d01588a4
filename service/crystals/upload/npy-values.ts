/**
 * A values file as .npy (NumPy's format, versions 1 to 3). Read here and not by npyjs: that needs the file in memory, takes
 * truncated files, false shapes and big-endian numbers for good ones, and leaves Fortran order as it is.
 */
import { blocksFrom, bytesAt, type OpenFile } from './file-blocks.ts';
import {
  type DescribedAxis,
  faultyValues,
  matrixInProgress,
  type PerAxis,
  type ReadValues,
  refusalOf,
  requireShape,
} from './values-part.ts';

export const NPY_MAGIC = Buffer.from('\x93NUMPY', 'latin1');
/** NumPy itself refuses longer headers unless told to trust them. */
const MOST_HEADER_BYTES = 65_536;

interface NpyHeader {
  readonly bytesPerNumber: 4 | 8;
  readonly bigEndian: boolean;
  readonly fortranOrder: boolean;
  readonly shape: readonly number[];
  readonly end: number;
}

export function readNpy(file: OpenFile, axes: PerAxis<DescribedAxis | undefined>): ReadValues {
  const header = headerOf(file);
  const { shape, bytesPerNumber, bigEndian, fortranOrder, end } = header;
  if (shape.length !== 2)
    throw faultyValues(`has ${shape.length} dimensions; must have two, one row a momentum, one column an energy`);
  const [rows, columns] = shape;
  requireShape(rows, columns, axes);
  const needed = end + rows * columns * bytesPerNumber;
  if (file.size !== needed) {
    const how = file.size < needed ? 'is cut short' : 'goes on behind its numbers';
    throw faultyValues(`${how}: ${file.size} bytes, where ${rows} × ${columns} numbers make ${needed}`);
  }
  const matrix = matrixInProgress(rows, columns);
  const { values } = matrix;
  let at = 0;
  for (const block of blocksFrom(file, end)) {
    const numbers = numbersOf(block, bytesPerNumber, bigEndian);
    for (let k = 0; k < numbers.length; k++, at++) {
      const value = numbers[k];
      const index = fortranOrder ? (at % rows) * columns + Math.floor(at / rows) : at;
      if (value >= 0 && value < Infinity)
        values[index] = value + 0; // −0 is 0
      else matrix.refuse(index, refusalOf(value));
    }
  }
  const endian = bigEndian ? ', big endian' : '';
  const order = fortranOrder ? ', in Fortran order: put in rows' : '';
  return {
    matrix: matrix.done(),
    axes: {},
    inferred: [`values: .npy of float${8 * bytesPerNumber}${endian}, ${rows} × ${columns}${order}`],
  };
}

/** The numbers of a block, which is overwritten if it has to be turned round. */
function numbersOf(block: Buffer, bytesPerNumber: 4 | 8, bigEndian: boolean): Float32Array | Float64Array {
  if (bigEndian) bytesPerNumber === 8 ? block.swap64() : block.swap32();
  const count = block.length / bytesPerNumber;
  return bytesPerNumber === 8
    ? new Float64Array(block.buffer, block.byteOffset, count)
    : new Float32Array(block.buffer, block.byteOffset, count);
}

function headerOf(file: OpenFile): NpyHeader {
  const start = bytesAt(file, 0, 12);
  if (start.length < 12) throw faultyValues('is cut short: it has no .npy header');
  const [major, minor] = [start[6], start[7]];
  if (major < 1 || major > 3 || minor !== 0)
    throw faultyValues(`is .npy of version ${major}.${minor}; known are 1 to 3`);
  const from = major === 1 ? 10 : 12;
  const length = major === 1 ? start.readUInt16LE(8) : start.readUInt32LE(8);
  if (length > MOST_HEADER_BYTES)
    throw faultyValues(`has a .npy header of ${length} bytes; at most ${MOST_HEADER_BYTES}`);
  const header = bytesAt(file, from, length);
  if (header.length < length) throw faultyValues('is cut short inside its .npy header');
  return { ...factsOf(header.toString(major === 3 ? 'utf8' : 'latin1')), end: from + length };
}

/** `{'descr': '<f8', 'fortran_order': False, 'shape': (3, 4), }`: a literal of Python, of which this is the only form. */
function factsOf(text: string): Omit<NpyHeader, 'end'> {
  const unreadable = (): Error => faultyValues('has a .npy header that cannot be read');
  const body = /^\{(.*)\}\s*$/s.exec(text)?.[1];
  if (body === undefined) throw unreadable();
  const facts = new Map<string, string>();
  const rest = body.replaceAll(
    /\s*(['"])(\w+)\1\s*:\s*('[^']*'|"[^"]*"|True|False|\([\d\sL,]*\)|\[[^[\]]*\])\s*(?:,|$)/g,
    (_, _quote, key: string, value: string) => {
      facts.set(key, value);
      return '';
    },
  );
  const [descr, order, shape] = ['descr', 'fortran_order', 'shape'].map((key) => facts.get(key));
  if (rest.trim() !== '' || facts.size !== 3 || !descr || !shape?.startsWith('(')) throw unreadable();
  if (order !== 'True' && order !== 'False') throw unreadable();
  const number = /^['"]([<>])f([48])['"]$/.exec(descr);
  if (!number) throw faultyValues(`has numbers of the type ${descr.slice(0, 40)}; must be float32 or float64`);
  const sizes = shape.slice(1, -1).split(',').map((size) => size.trim()).filter(Boolean); // biome-ignore format: one line
  if (!sizes.every((size) => /^\d{1,15}L?$/.test(size))) throw unreadable();
  return {
    bytesPerNumber: number[2] === '8' ? 8 : 4,
    bigEndian: number[1] === '>',
    fortranOrder: order === 'True',
    shape: sizes.map((size) => Number.parseInt(size, 10)),
  };
}
