/** A values file without its gzip, which is known by its first bytes. */
import fs from 'node:fs';
import { pipeline } from 'node:stream/promises';
import { createGunzip } from 'node:zlib';
import { Problem } from '../../problem.ts';
import { bytesAt, withFile } from './file-blocks.ts';
import { faultyValues } from './values-part.ts';

const GZIP_MAGIC = Buffer.from([0x1f, 0x8b]);

/** The path of the plain file: the one given, or another beside it. Stops at `mostBytes`, whatever the archive holds. */
export async function unpacked(
  file: string,
  mostBytes: number,
): Promise<{ readonly file: string; readonly gzip: boolean }> {
  if (!isGzip(file)) return { file, gzip: false };
  const plain = `${file}.plain`;
  let size = 0;
  try {
    await pipeline(
      fs.createReadStream(file),
      createGunzip(),
      async function* (chunks: AsyncIterable<Buffer>) {
        for await (const chunk of chunks) {
          size += chunk.length;
          if (size > mostBytes)
            throw new Problem('too-large', `The values are larger than ${mostBytes / 2 ** 20} MiB when unpacked.`);
          yield chunk;
        }
      },
      fs.createWriteStream(plain),
    );
  } catch (error) {
    if (String((error as NodeJS.ErrnoException).code).startsWith('Z_'))
      throw faultyValues('is not a whole gzip archive');
    throw error;
  }
  if (isGzip(plain)) throw faultyValues('is packed twice with gzip; once is enough');
  return { file: plain, gzip: true };
}

function isGzip(file: string): boolean {
  return withFile(file, (open) => bytesAt(open, 0, 2)).equals(GZIP_MAGIC);
}
