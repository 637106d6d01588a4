/** Uploaded tables as they come in over HTTP: received into a folder of their own, read by a worker thread, gone afterwards. */
import type { Context } from 'hono';
import type { Compute } from '../../compute/compute.ts';
import { Problem } from '../../problem.ts';
import { decodedBody } from '../../request-body.ts';
import type { CrystalInput } from '../../schemas/crystal.ts';
import { receiveForm } from './receive-form.ts';
import { inUploadFolder } from './upload-folder.ts';

/** A form as it is sent, and its values once unpacked. */
const MOST_FORM_BYTES = 256 * 2 ** 20;
/** Bytes of all forms that are being received or read; more than this and the next one is told to come back. */
const MOST_BYTES_HELD = 2 ** 30;

export interface CrystalUploads {
  /** `signalOf` starts the clock of the deadline: it is for reading a table, not for how long the caller takes to send it. */
  read(c: Context, signalOf: () => AbortSignal): Promise<CrystalInput>;
}

export function isMultipart(c: Context): boolean {
  return /^\s*multipart\/form-data\s*(?:;|$)/i.test(c.req.header('content-type') ?? '');
}

export function crystalUploads(uploads: string, compute: Compute): CrystalUploads {
  let held = 0;
  return {
    async read(c, signalOf) {
      let size = 0;
      const counted = async function* (): AsyncGenerator<Uint8Array> {
        for await (const chunk of decodedBody(c, MOST_FORM_BYTES, 'as a form')) {
          size += chunk.length;
          held += chunk.length;
          if (held > MOST_BYTES_HELD)
            throw new Problem('busy', 'Too many large uploads at once.', [], { 'Retry-After': '5' });
          yield chunk;
        }
      };
      try {
        return await inUploadFolder(uploads, async (folder) => {
          const form = await receiveForm(c.req.header('content-type')!, counted(), folder);
          return compute.run('readUpload', { ...form, mostBytes: MOST_FORM_BYTES }, { signal: signalOf() });
        });
      } finally {
        held -= size;
      }
    },
  };
}
