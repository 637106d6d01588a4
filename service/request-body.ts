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
const MOST_JSON_BYTES = 64 * 2 ** 20;
/** Bodies up to this size are parsed where they arrive: well under a millisecond. */
const SMALL_BYTES = 32 * 2 ** 10;
/** Bytes of bodies held at once by all requests together; more than this and the next one is told to come back. */
const MOST_BYTES_HELD = 512 * 2 ** 20;

export interface BodyReader {
  /** `alternatives` are the media types beside JSON that are read elsewhere. */
  read<N extends BodyName>(
    c: Context,
    body: N,
    signal: AbortSignal,
    alternatives?: readonly string[],
  ): Promise<z.output<(typeof BODIES)[N]>>;
}

export function bodyReader(compute: Compute): BodyReader {
  let held = 0;
  return {
    async read(c, body, signal, alternatives = []) {
      requireJson(c.req.header('content-type'), alternatives);
      const chunks: Uint8Array[] = [];
      let size = 0;
      try {
        for await (const chunk of decodedBody(c, MOST_JSON_BYTES, 'of JSON')) {
          size += chunk.length;
          held += chunk.length;
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

function tooLarge(mostBytes: number, what: string): Problem {
  return new Problem('too-large', `The body is larger than ${mostBytes / 2 ** 20} MiB ${what}.`);
}

function requireJson(contentType: string | undefined, alternatives: readonly string[]): void {
  const match = /^application\/(?:[\w.+-]+\+)?json\s*(?:;\s*charset\s*=\s*"?([\w-]+)"?\s*)?$/i.exec(contentType ?? '');
  if (match && (match[1] === undefined || /^utf-?8$/i.test(match[1]))) return;
  const others = alternatives.map((type) => `, or ${type}`).join('');
  throw new Problem('media-type', `Send application/json in UTF-8${others}.`, [], {
    'Accept-Post': ['application/json', ...alternatives].join(', '),
  });
}

/**
 * The body's bytes, decompressed: at most `mostBytes` of them, before and after. A broken archive, or one with something behind
 * it, is a malformed body.
 */
export async function* decodedBody(c: Context, mostBytes: number, what: string): AsyncGenerator<Uint8Array> {
  let size = 0;
  for await (const chunk of unboundedBody(c, mostBytes, what)) {
    size += chunk.length;
    if (size > mostBytes) throw tooLarge(mostBytes, what);
    yield chunk;
  }
}

async function* unboundedBody(c: Context, mostBytes: number, what: string): AsyncGenerator<Uint8Array> {
  const encoding = (c.req.header('content-encoding') ?? 'identity').trim().toLowerCase();
  const declared = Number(c.req.header('content-length') ?? 0);
  if (declared > mostBytes) throw tooLarge(mostBytes, what);
  const body = c.req.raw.body;
  if (!body) return;
  if (encoding === 'identity' && declared > 0 && declared <= SMALL_BYTES) {
    yield new Uint8Array(await c.req.arrayBuffer()); // the server holds a body to its declared length: no stream is needed
    return;
  }
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
