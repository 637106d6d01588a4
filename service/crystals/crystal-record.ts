/**
 * A stored table and its canonical content: one line of canonical JSON (RFC 8785) that says everything but the values,
 * then the values as little-endian float64, row after row. The id is the SHA-256 of exactly these bytes, and a file in the store
 * holds exactly these bytes.
 */
import { createHash } from 'node:crypto';
import canonicalize from 'canonicalize';
import type { ChargeHeader } from '../schemas/charge-table.ts';
import type { CrystalHeader } from '../schemas/crystal.ts';
import type { GivenTable } from './given-table.ts';

/** What is stored: a crystal's header with its values, or a charge table, which is all header. */
export type StoredHeader = CrystalHeader | ChargeHeader;

export interface TableRecord<H extends StoredHeader> {
  readonly id: string;
  readonly header: H;
  /** Row-major, on shared memory: workers use it without a copy. */
  readonly values: Float64Array;
}

export type CrystalRecord = TableRecord<CrystalHeader>;

export const TABLE_ID = /^[0-9a-f]{64}$/;

/** A table whose bytes are not what they should be. */
export class DamagedTableError extends Error {}

/** Rows × columns that the axes make. */
export function shapeOf(header: CrystalHeader): { readonly rows: number; readonly columns: number } {
  const less = header.axes === 'edges' ? 1 : 0;
  return { rows: header.momentumKev.length - less, columns: header.energyEv.length - less };
}

/** How many matrices the values are: the real and then the imaginary part of a dielectric function, else one. */
export function matricesOf({ quantity }: CrystalHeader): number {
  return quantity === 'dielectricFunction' ? 2 : 1;
}

/** The canonical content, piece by piece: the values are not copied. All machines this runs on are little-endian. */
export function contentOf(header: StoredHeader, values: Float64Array): readonly Buffer[] {
  const line = Buffer.from(`${canonicalize(header)}\n`, 'utf8');
  return [line, Buffer.from(values.buffer, values.byteOffset, values.byteLength)];
}

export function idOf(content: readonly Buffer[]): string {
  const hash = createHash('sha256');
  for (const piece of content) hash.update(piece);
  return hash.digest('hex');
}

/** Reads canonical content back and checks it against its id; throws DamagedTableError. */
export function recordOf(id: string, content: Buffer): TableRecord<StoredHeader> {
  if (idOf([content]) !== id) throw new DamagedTableError('content does not match its hash');
  const { header, end } = headerOf(content);
  const { rows, columns } = 'axes' in header ? shapeOf(header) : { rows: 0, columns: 0 };
  const bytes = 'axes' in header ? 8 * matricesOf(header) * rows * columns : 0;
  if (content.length - end !== bytes) throw new DamagedTableError('content does not match its axes');
  const shared = new SharedArrayBuffer(bytes);
  new Uint8Array(shared).set(content.subarray(end));
  return { id, header, values: new Float64Array(shared) };
}

/** The header at the beginning of canonical content, and where the values begin. */
export function headerOf(content: Buffer): { readonly header: StoredHeader; readonly end: number } {
  const newline = content.indexOf(0x0a);
  if (newline < 0) throw new DamagedTableError('has no header');
  try {
    return { header: JSON.parse(content.toString('utf8', 0, newline)) as StoredHeader, end: newline + 1 };
  } catch {
    throw new DamagedTableError('has an unreadable header');
  }
}

function partsOf(
  { quantity }: CrystalHeader,
  values: Float64Array,
): Pick<GivenTable, 'quantity' | 'values' | 'realDielectric'> {
  if (quantity !== 'dielectricFunction') return { quantity, values };
  const half = values.length / 2;
  return {
    quantity: 'imaginaryDielectric',
    values: values.subarray(half),
    realDielectric: values.subarray(0, half),
  };
}

/** Tables made of headers: one stays with its header, and its axes, like its values, are shared with workers and not copied. */
const tables = new WeakMap<CrystalHeader, GivenTable>();

/** The table as the calculation wants it: eV throughout. */
export function tableOf(header: CrystalHeader, values: Float64Array): GivenTable {
  const known = tables.get(header);
  if (known) return known;
  const shared = (numbers: readonly number[], factor: number): Float64Array => {
    const array = new Float64Array(new SharedArrayBuffer(8 * numbers.length));
    for (let i = 0; i < numbers.length; i++) array[i] = numbers[i] * factor;
    return array;
  };
  const table: GivenTable = {
    axes: header.axes,
    ...partsOf(header, values),
    momentumEv: shared(header.momentumKev, 1e3),
    energyEv: shared(header.energyEv, 1),
    cellMassEv: header.cellMassGev * 1e9,
    ...(header.cellVolumeAngstrom3 === undefined ? {} : { cellVolumeAngstrom3: header.cellVolumeAngstrom3 }),
  };
  tables.set(header, table);
  return table;
}
