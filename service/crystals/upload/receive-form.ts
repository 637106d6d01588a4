/**
 * The two parts of an uploaded table out of a multipart/form-data body: the description into memory, the values into a file as
 * they come. A part is known by its name alone; file names, media types and the order of the parts do not matter.
 */
import fs from 'node:fs';
import path from 'node:path';
import { Readable } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import { Busboy, type BusboyFileStream, type BusboyInstance } from '@fastify/busboy';
import { type Fault, invalidInput, Problem, pointerOf } from '../../problem.ts';

/** Two axes of 100,000 numbers each and a long provenance fit well. */
const MOST_DESCRIPTION_BYTES = 8 * 2 ** 20;
/** A form of more parts than this is no table. */
const MOST_PARTS = 10;

export interface ReceivedForm {
  readonly description: Uint8Array;
  /** Path of the file with the values, as they were sent. */
  readonly values: string;
}

/** Throws a Problem for a form that cannot be read or has other parts, the system's error where the disk refuses. */
export async function receiveForm(
  contentType: string,
  body: AsyncIterable<Uint8Array>,
  folder: string,
): Promise<ReceivedForm> {
  const form = formParser(contentType);
  const source = Readable.from(body, { objectMode: false });
  const values = path.join(folder, 'values');
  const description: Uint8Array[] = [];
  const seen: string[] = [];
  const faults: Fault[] = [];
  const streams: BusboyFileStream[] = [];
  const parts: Promise<void>[] = [];
  form.on('partsLimit', () => source.destroy(new Problem('malformed-body', `The form has over ${MOST_PARTS} parts.`)));
  form.on('file', (name: string | undefined, stream) => {
    streams.push(stream);
    const fault = faultOfPart(name, seen);
    if (fault) faults.push(fault);
    seen.push(name ?? '');
    const part = fault ? skip(stream) : name === 'values' ? save(stream, values) : collect(stream, description);
    parts.push(part.catch((error: Error) => void source.destroy(error)));
  });
  try {
    await pipeline(source, form);
    await Promise.all(parts);
    if (source.errored) throw source.errored;
  } catch (error) {
    throw isOurs(error) ? error : new Problem('malformed-body', 'The body is not a whole multipart form.');
  } finally {
    for (const stream of streams) stream.destroy();
    await Promise.allSettled(parts); // the file is closed before its folder goes
  }
  for (const name of ['description', 'values'])
    if (!seen.includes(name)) faults.push({ pointer: `/${name}`, detail: 'this part of the form is missing' });
  if (faults.length > 0) throw invalidInput(faults);
  return { description: Buffer.concat(description), values };
}

function formParser(contentType: string): BusboyInstance {
  try {
    return new Busboy({
      headers: { 'content-type': contentType },
      isPartAFile: () => true, // every part as a stream: a part is bounded here, not there
      limits: { parts: MOST_PARTS, headerPairs: 20, headerSize: 16_384 },
    });
  } catch {
    throw new Problem('malformed-body', 'The Content-Type names no boundary between the parts of the form.');
  }
}

function faultOfPart(name: string | undefined, seen: readonly string[]): Fault | undefined {
  const pointer = pointerOf([(name ?? '').slice(0, 100)]);
  if (name !== 'description' && name !== 'values')
    return { pointer, detail: 'is not a known part; the form has "description" and "values"' };
  return seen.includes(name) ? { pointer, detail: 'this part of the form is there twice' } : undefined;
}

/** What is wrong with the form itself comes without a code; what our own side finds is a Problem or a system error. */
function isOurs(error: unknown): boolean {
  if (error instanceof Problem) return true;
  const code = (error as NodeJS.ErrnoException | undefined)?.code;
  return code !== undefined && !code.startsWith('ERR_STREAM');
}

async function save(stream: Readable, file: string): Promise<void> {
  await pipeline(stream, fs.createWriteStream(file, { flags: 'wx', highWaterMark: 2 ** 20 }));
}

async function collect(stream: Readable, chunks: Uint8Array[]): Promise<void> {
  let size = 0;
  for await (const chunk of stream as AsyncIterable<Uint8Array>) {
    size += chunk.length;
    if (size > MOST_DESCRIPTION_BYTES)
      throw new Problem('too-large', `The description is larger than ${MOST_DESCRIPTION_BYTES / 2 ** 20} MiB.`);
    chunks.push(chunk);
  }
}

async function skip(stream: Readable): Promise<void> {
  for await (const _ of stream);
}
