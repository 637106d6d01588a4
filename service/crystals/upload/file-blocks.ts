/** Reading a file block by block, so that a large one is never in memory as a whole. */
import fs from 'node:fs';

const BLOCK_BYTES = 2 ** 20;

export interface OpenFile {
  readonly descriptor: number;
  readonly size: number;
}

export function withFile<T>(file: string, work: (open: OpenFile) => T): T {
  const descriptor = fs.openSync(file, 'r');
  try {
    return work({ descriptor, size: fs.fstatSync(descriptor).size });
  } finally {
    fs.closeSync(descriptor);
  }
}

/** The first bytes, at most `length` of them. */
export function bytesAt({ descriptor }: OpenFile, position: number, length: number): Buffer {
  const bytes = Buffer.alloc(length);
  return bytes.subarray(0, fs.readSync(descriptor, bytes, 0, length, position));
}

/** The bytes from `position` on, in blocks whose length divides by 8 but for the last. The same memory serves every block. */
export function* blocksFrom({ descriptor }: OpenFile, position: number): Generator<Buffer> {
  const block = Buffer.from(new ArrayBuffer(BLOCK_BYTES));
  for (let at = position; ; ) {
    let length = 0;
    while (length < BLOCK_BYTES) {
      const read = fs.readSync(descriptor, block, length, BLOCK_BYTES - length, at + length);
      if (read === 0) break;
      length += read;
    }
    if (length > 0) yield block.subarray(0, length);
    if (length < BLOCK_BYTES) return;
    at += length;
  }
}
