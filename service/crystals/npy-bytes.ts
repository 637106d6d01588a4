/** A table's values as .npy, version 1.0, float64 in rows: in pieces, so that a large one is never copied as a whole. */

import type { CrystalHeader } from '../schemas/crystal.ts';
import { shapeOf } from './crystal-record.ts';

const PIECE_BYTES = 2 ** 18;
/** The header's length is a multiple of this, so that the numbers are aligned. */
const ALIGNMENT = 64;

function headerOf(header: CrystalHeader): Buffer {
  const { rows, columns } = shapeOf(header);
  const text = `{'descr': '<f8', 'fortran_order': False, 'shape': (${rows}, ${columns}), }`;
  const length = Math.ceil((10 + text.length + 1) / ALIGNMENT) * ALIGNMENT - 10;
  const start = Buffer.from([0x93, ...Buffer.from('NUMPY'), 1, 0, length & 0xff, length >> 8]);
  return Buffer.concat([start, Buffer.from(`${text.padEnd(length - 1)}\n`, 'latin1')]);
}

export function npyBytes(
  header: CrystalHeader,
  values: Float64Array,
): { readonly length: number; readonly pieces: () => Generator<Uint8Array> } {
  const start = headerOf(header);
  const bytes = new Uint8Array(values.buffer, values.byteOffset, values.byteLength);
  return {
    length: start.length + bytes.length,
    *pieces() {
      yield start;
      for (let at = 0; at < bytes.length; at += PIECE_BYTES) yield bytes.slice(at, at + PIECE_BYTES);
    },
  };
}
