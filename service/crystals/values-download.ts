/** A table's values as they go out: the first piece is there before the answer begins, the rest follows as the caller takes it. */
import type { Compute } from '../compute/compute.ts';
import { type CrystalRecord, matricesOf, shapeOf } from './crystal-record.ts';
import { npyBytes } from './npy-bytes.ts';

/** Numbers turned into text at a time. */
const NUMBERS_TOGETHER = 131_072;

export const VALUES_TYPES = ['application/json', 'application/octet-stream', 'text/csv'] as const;
export type ValuesType = (typeof VALUES_TYPES)[number];

/** What sets the variants of the same URL apart: a part of the ETag, and the ending of a file. */
export const VARIANTS: Readonly<Record<ValuesType, { readonly tag: string; readonly ending: string | undefined }>> = {
  'application/json': { tag: '-values', ending: undefined },
  'application/octet-stream': { tag: '-values-npy', ending: 'npy' },
  'text/csv': { tag: '-values-csv', ending: 'csv' },
};

export interface Download {
  readonly body: Uint8Array<ArrayBuffer> | ReadableStream<Uint8Array>;
  /** Bytes, where they are known. */
  readonly length?: number;
}

export async function valuesDownload(
  record: CrystalRecord,
  type: ValuesType,
  compute: Compute,
  signals: { readonly first: AbortSignal; readonly rest: AbortSignal },
): Promise<Download> {
  const { header, values } = record;
  if (type === 'application/octet-stream') {
    const { length, pieces } = npyBytes(header, values);
    return { body: streamOf(pieces()), length };
  }
  const { rows: rowsOfOne, columns } = shapeOf(header);
  const rows = rowsOfOne * matricesOf(header);
  const together = Math.max(1, Math.floor(NUMBERS_TOGETHER / columns));
  const format = type === 'application/json' ? 'json' : 'csv';
  const text = (from: number, signal: AbortSignal): Promise<Uint8Array> =>
    compute.run('valuesText', { header, values, format, from, to: Math.min(rows, from + together) }, { signal });
  const first = await text(0, signals.first);
  if (together >= rows) return { body: first as Uint8Array<ArrayBuffer> };
  return {
    body: streamOf(
      (async function* () {
        yield first;
        for (let from = together; from < rows; from += together) yield await text(from, signals.rest);
      })(),
    ),
  };
}

/** Pulled, never pushed: a HEAD takes nothing, and a caller who leaves ends it. */
function streamOf(pieces: Generator<Uint8Array> | AsyncGenerator<Uint8Array>): ReadableStream<Uint8Array> {
  return new ReadableStream<Uint8Array>(
    {
      async pull(controller) {
        const { done, value } = await pieces.next();
        if (done) controller.close();
        else controller.enqueue(value);
      },
      async cancel() {
        await pieces.return(undefined);
      },
    },
    { highWaterMark: 0 },
  );
}
