/**
 * The two parts of an upload → a table, checked like one in JSON. Runs in a worker thread. Faults of the description have pointers
 * into it (`/momentum/edges/3`), faults of the file are at `/values`, or at `/values/i/j` for row i and column j of the table.
 */
import { jsonOf } from '../../compute/parse-body.ts';
import { type Fault, invalidInput, Problem } from '../../problem.ts';
import { type CrystalInput, CrystalTableIn } from '../../schemas/crystal.ts';
import { faultsOf, parseInput } from '../../validation.ts';
import { readCsv } from './csv-values.ts';
import { bytesAt, withFile } from './file-blocks.ts';
import { HDF5_MAGIC, readHdf5 } from './hdf5-values.ts';
import { NPY_MAGIC, readNpy } from './npy-values.ts';
import { unpacked } from './unpack.ts';
import { isFields, type UploadDescription, uploadDescription } from './upload-description.ts';
import { AXES, type AxisName, faultyValues, type ReadValues } from './values-part.ts';

export interface UploadJob {
  readonly description: Uint8Array;
  /** Path of the values, as they were sent; they may be unpacked beside it. */
  readonly values: string;
  readonly mostBytes: number;
}

export async function readUpload({ description, values, mostBytes }: UploadJob): Promise<CrystalInput> {
  const json = jsonOf(description, 'description');
  if (!isFields(json)) return parseInput(CrystalTableIn, json);
  const upload = uploadDescription(json);
  const faults: Fault[] = [...upload.faults];
  const read = await readValues(values, upload, mostBytes).catch((error: unknown) => {
    if (!(error instanceof Problem) || error.type !== 'invalid-input') throw error;
    const told = new Set(faults.map(({ pointer }) => pointer));
    faults.push(...error.faults.filter(({ pointer }) => !told.has(pointer)));
    return undefined;
  });
  const parsed = CrystalTableIn.safeParse(wholeTable(upload, read));
  if (!parsed.success) faults.push(...placed(faultsOf(parsed.error), upload, read));
  if (!parsed.success || !read || faults.length > 0) throw invalidInput(faults);
  return { ...parsed.data, inferred: read.inferred };
}

async function readValues(file: string, upload: UploadDescription, mostBytes: number): Promise<ReadValues> {
  const plain = await unpacked(file, mostBytes);
  const read = await readPlain(plain.file, upload);
  return plain.gzip ? { ...read, inferred: ['values: packed with gzip', ...read.inferred] } : read;
}

async function readPlain(file: string, { described, dataset, axisDatasets }: UploadDescription): Promise<ReadValues> {
  const start = withFile(file, (open) => bytesAt(open, 0, 8));
  const startsWith = (magic: Buffer): boolean => start.subarray(0, magic.length).equals(magic);
  if (startsWith(HDF5_MAGIC)) return readHdf5({ file, dataset, axisDatasets, described });
  const paths = [
    ...(dataset === undefined ? [] : ['/dataset']),
    ...AXES.filter((name) => axisDatasets[name] !== undefined).map((name) => `/${name}/dataset`),
  ];
  if (paths.length > 0)
    throw invalidInput(paths.map((pointer) => ({ pointer, detail: 'is for HDF5, which the values are not' })));
  if (startsWith(Buffer.from('PK\x03\x04')))
    throw faultyValues('is a zip archive; send the one file in it that is the table');
  return withFile(file, (open) => (startsWith(NPY_MAGIC) ? readNpy(open, described) : readCsv(open, described)));
}

/** The table as it would have come in JSON. */
function wholeTable({ table, quantity }: UploadDescription, read: ReadValues | undefined): unknown {
  const whole: Record<string, unknown> = { ...table };
  for (const name of AXES) {
    const axis = read?.axes[name];
    if (!axis) continue;
    const unit = axis.unit === undefined ? {} : { unit: axis.unit };
    whole[name] = { ...unit, ...(isFields(table[name]) ? table[name] : {}), [axis.kind]: axis.numbers };
  }
  return read ? { ...whole, [quantity]: read.matrix } : whole;
}

/** Faults of a table in JSON, put where the caller of a form finds what they are about. */
function placed(faults: readonly Fault[], upload: UploadDescription, read: ReadValues | undefined): Fault[] {
  const { quantity, described, axisDatasets } = upload;
  return faults.flatMap((fault): Fault[] => {
    const pointer = fault.pointer ?? '';
    const [, field = '', kind] = pointer.split('/');
    if (field === quantity) return [{ ...fault, pointer: `/values${pointer.slice(quantity.length + 1)}` }];
    if (!read) return isAboutValues(pointer, upload) ? [] : [fault];
    const axis = AXES.find((name) => name === field && read.axes[name]);
    if (!axis || (kind !== 'edges' && kind !== 'points')) return [fault];
    return axisDatasets[axis] === undefined
      ? [{ pointer: '/values', detail: `${axis}: ${fault.detail}` }]
      : [{ pointer: `/${axis}/dataset`, detail: fault.detail }];
  });

  /** What only says that there are no values, or no axis where the values would have brought it. */
  function isAboutValues(pointer: string, { table }: UploadDescription): boolean {
    if (pointer === '') return true;
    const axis = AXES.find((name: AxisName) => pointer === `/${name}`);
    return axis !== undefined && described[axis] === undefined && (table[axis] === undefined || isFields(table[axis]));
  }
}
