/**
 * Reading a request body: bounded before and after decompression, validated on the event loop when small and in a worker thread
 * when not.
 */
import { Readable } from 'node:stream';
import { createGunzip } from 'node:zlib';
import type { Context } from 'hono';
import type { z } from 'zod';
import type { Compute } from './compute/compute.ts';
import { parseBody } from './compute/parse-body.ts';
import { Problem } from './problem.ts';
import type { BODIES, BodyName } from './schemas/bodies.ts';

/** JSON bodies, decoded. */
export const MOST_JSON_BYTES = 64 * 2 ** 20;
/** Bodies up to this size are parsed where they arrive: well under a millisecond. */
const SMALL_BYTES = 32 * 2 ** 10;
/** Bytes of bodies held at once by all requests together; more than this and the next one is told to come back. */
const MOST_BYTES_HELD = 512 * 2 ** 20;

export interface BodyReader {
  read<N extends BodyName>(c: Context, body: N, signal: AbortSignal): Promise<z.output<(typeof BODIES)[N]>>;
}

export function bodyReader(compute: Compute): BodyReader {
  let held = 0;
  return {
    async read(c, body, signal) {
      requireJson(c.req.header('content-type'));
      const chunks: Uint8Array[] = [];
      let size = 0;
      try {
        for await (const chunk of decodedBody(c)) {
          size += chunk.length;
          held += chunk.length;
          if (size > MOST_JSON_BYTES) throw tooLarge();
          if (held > MOST_BYTES_HELD)
            throw new Problem('busy', 'Too many large requests at once.', [], { 'Retry-After': '2' });
          chunks.push(chunk);
        }
        const bytes = new Uint8Array(size);
        let at = 0;
        for (const chunk of chunks) {
          bytes.set(chunk, at);
          at += chunk.length;
        }
        return (
          size <= SMALL_BYTES ? parseBody({ body, bytes }) : await compute.run('parseBody', { body, bytes }, { signal })
        ) as never;
      } finally {
        held -= size;
      }
    },
  };
}

function tooLarge(): Problem {
  return new Problem('too-large', `The body is larger than ${MOST_JSON_BYTES / 2 ** 20} MiB of JSON.`);
}

function requireJson(contentType: string | undefined): void {
  const match = /^application\/(?:[\w.+-]+\+)?json\s*(?:;\s*charset\s*=\s*"?([\w-]+)"?\s*)?$/i.exec(contentType ?? '');
  if (match && (match[1] === undefined || /^utf-?8$/i.test(match[1]))) return;
  throw new Problem('media-type', 'Send application/json in UTF-8.', [], { 'Accept-Post': 'application/json' });
}

/** The body's bytes, decompressed. A broken archive, or one with something behind it, is a malformed body. */
async function* decodedBody(c: Context): AsyncGenerator<Uint8Array> {
  const encoding = (c.req.header('content-encoding') ?? 'identity').trim().toLowerCase();
  const declared = Number(c.req.header('content-length') ?? 0);
  if (declared > MOST_JSON_BYTES) throw tooLarge();
  const body = c.req.raw.body;
  if (!body) return;
  const source = Readable.fromWeb(body as never);
  if (encoding === 'identity') {
    yield* source;
    return;
  }
  if (encoding !== 'gzip' && encoding !== 'x-gzip') {
    throw new Problem('media-type', `Content-Encoding "${encoding}" is not understood; send gzip or none.`, [], {
      'Accept-Encoding': 'gzip',
    });
  }
  const gunzip = createGunzip();
  source.on('error', (error) => gunzip.destroy(error));
  source.pipe(gunzip);
  try {
    yield* gunzip;
  } catch (error) {
    if (String((error as NodeJS.ErrnoException).code).startsWith('Z_'))
      throw new Problem('malformed-body', 'The body is not a whole gzip archive.');
    throw error;
  } finally {
    gunzip.destroy();
    source.destroy();
  }
}
