/**
 * Reading and writing table files. Runs in a worker thread: hashing and writing megabytes must not hold up the event loop.
 *
 * A file is written under a temporary name in the same folder, flushed to the disk, and renamed: it is there whole or not at
 * all, whatever happens in between. What a killed process leaves under a temporary name is swept at the next start.
 */
import fs from 'node:fs';
import path from 'node:path';
import { contentOf, headerOf, recordOf, type StoredHeader, TABLE_ID, type TableRecord } from './crystal-record.ts';

const ENDING = '.table';
const TEMPORARY = '.part';
/** Long enough for any write in progress to be over. */
const STALE_MS = 3_600_000;
/** Compared with a stored file at a time. */
const COMPARED_BYTES = 2 ** 20;

function fileOf(folder: string, id: string): string {
  return path.join(folder, id + ENDING);
}

/** Stores a table; `created` is false if the same one is already there. Throws the system's error where the disk refuses. */
export function writeTable(folder: string, { id, header, values }: TableRecord<StoredHeader>): { created: boolean } {
  const content = contentOf(header, values);
  const file = fileOf(folder, id);
  if (holds(file, content)) return { created: false };
  makeFolder(folder);
  const temporary = path.join(folder, `${id}-${process.pid}-${process.hrtime.bigint()}${TEMPORARY}`);
  try {
    const descriptor = fs.openSync(temporary, 'wx');
    try {
      for (const piece of content) fs.writeFileSync(descriptor, piece);
      fs.fsyncSync(descriptor);
    } finally {
      fs.closeSync(descriptor);
    }
    fs.renameSync(temporary, file);
  } catch (error) {
    fs.rmSync(temporary, { force: true });
    throw error;
  }
  syncFolder(folder);
  return { created: true };
}

/** A read-only file system answers a recursive mkdir with ENOENT: told as what it is. */
export function makeFolder(folder: string): void {
  try {
    fs.mkdirSync(folder, { recursive: true });
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'ENOENT') throw error;
    throw Object.assign(new Error(`cannot create ${folder}`, { cause: error }), { code: 'EROFS' });
  }
}

/** Whether the file has exactly this content: a damaged one is written again. */
function holds(file: string, content: readonly Buffer[]): boolean {
  let descriptor: number | undefined;
  try {
    descriptor = fs.openSync(file, 'r');
    const size = content.reduce((sum, piece) => sum + piece.length, 0);
    if (fs.fstatSync(descriptor).size !== size) return false;
    for (const piece of content) if (!goesOnWith(descriptor, piece)) return false;
    return true;
  } catch {
    return false;
  } finally {
    if (descriptor !== undefined) fs.closeSync(descriptor);
  }
}

/** Whether a file goes on with these bytes, read in blocks: a large table is not in memory twice. */
function goesOnWith(descriptor: number, piece: Buffer): boolean {
  const block = Buffer.alloc(Math.min(COMPARED_BYTES, piece.length));
  for (let at = 0; at < piece.length; ) {
    const length = fs.readSync(descriptor, block, 0, Math.min(block.length, piece.length - at), null);
    if (length === 0 || !block.subarray(0, length).equals(piece.subarray(at, at + length))) return false;
    at += length;
  }
  return true;
}

function syncFolder(folder: string): void {
  const descriptor = fs.openSync(folder, 'r');
  try {
    fs.fsyncSync(descriptor);
  } finally {
    fs.closeSync(descriptor);
  }
}

/** Whether there is no such file, or no such folder: a DATA_DIR that cannot be is an empty one to a reader. */
function isAbsent(error: unknown): boolean {
  return ['ENOENT', 'ENOTDIR'].includes((error as NodeJS.ErrnoException).code ?? '');
}

/** Loads a table and checks it against its id; undefined if there is none. Throws DamagedTableError. */
export function readTable(folder: string, id: string): TableRecord<StoredHeader> | undefined {
  let content: Buffer;
  try {
    content = fs.readFileSync(fileOf(folder, id));
  } catch (error) {
    if (isAbsent(error)) return undefined;
    throw error;
  }
  return recordOf(id, content);
}

/** The header of a stored table, without its values; undefined where it is gone or unreadable. */
export function readHeader(folder: string, id: string): StoredHeader | undefined {
  const chunk = Buffer.alloc(65_536);
  const parts: Buffer[] = [];
  let descriptor: number | undefined;
  try {
    descriptor = fs.openSync(fileOf(folder, id), 'r');
    for (;;) {
      const length = fs.readSync(descriptor, chunk, 0, chunk.length, null);
      if (length === 0) return undefined;
      parts.push(Buffer.from(chunk.subarray(0, length)));
      if (chunk.subarray(0, length).includes(0x0a)) return headerOf(Buffer.concat(parts)).header;
    }
  } catch {
    return undefined;
  } finally {
    if (descriptor !== undefined) fs.closeSync(descriptor);
  }
}

/** Ids of the stored tables. */
export function listTables(folder: string): string[] {
  let names: string[];
  try {
    names = fs.readdirSync(folder);
  } catch (error) {
    if (isAbsent(error)) return [];
    throw error;
  }
  return names
    .filter((name) => name.endsWith(ENDING))
    .map((name) => name.slice(0, -ENDING.length))
    .filter((id) => TABLE_ID.test(id))
    .sort();
}

/** Removes a table; false if there is none. */
export function removeTable(folder: string, id: string): boolean {
  try {
    fs.unlinkSync(fileOf(folder, id));
    return true;
  } catch (error) {
    if (isAbsent(error)) return false;
    throw error;
  }
}

/** Removes what killed processes left half written. */
export function sweepTemporaries(folder: string, nowMs: number): void {
  let names: string[];
  try {
    names = fs.readdirSync(folder);
  } catch {
    return;
  }
  for (const name of names.filter((name) => name.endsWith(TEMPORARY))) {
    const file = path.join(folder, name);
    try {
      if (nowMs - fs.statSync(file).mtimeMs > STALE_MS) fs.rmSync(file, { force: true });
    } catch {
      // another process swept it
    }
  }
}
