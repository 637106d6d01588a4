/**
 * Where the parts of an upload lie while they are read: a folder for each request, removed when the request is over, whatever
 * becomes of it. What a killed process leaves is swept at the next start.
 */
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { makeFolder } from '../table-files.ts';

/** Longer than any upload takes. */
const STALE_MS = 3_600_000;
/** Names the process that owns a folder, so that a start beside a running replica does not sweep what that one receives. */
const OWNER = /^(?<host>.+)-(?<pid>\d+)-[^-]+$/;

const hostName = (): string => os.hostname().replaceAll(/[^\w.]/g, '_');

/** Runs `work` with a fresh folder inside `uploads`. Throws the system's error where the disk refuses. */
export async function inUploadFolder<T>(uploads: string, work: (folder: string) => Promise<T>): Promise<T> {
  makeFolder(uploads);
  const folder = await fs.promises.mkdtemp(path.join(uploads, `${hostName()}-${process.pid}-`));
  try {
    return await work(folder);
  } finally {
    await fs.promises.rm(folder, { recursive: true, force: true });
  }
}

/** Removes the folders of processes that are gone. */
export function sweepUploads(uploads: string, nowMs: number): void {
  let names: string[];
  try {
    names = fs.readdirSync(uploads);
  } catch {
    return;
  }
  for (const name of names) {
    const folder = path.join(uploads, name);
    try {
      if (isOrphan(name) || nowMs - fs.statSync(folder).mtimeMs > STALE_MS)
        fs.rmSync(folder, { recursive: true, force: true });
    } catch {
      // another process swept it, or the disk cannot be written
    }
  }
}

/** Whether this machine's process of that number is gone, or the number has come to be our own: we received nothing yet. */
function isOrphan(name: string): boolean {
  const { host, pid } = OWNER.exec(name)?.groups ?? {};
  if (host !== hostName()) return false;
  if (Number(pid) === process.pid) return true;
  try {
    process.kill(Number(pid), 0);
    return false;
  } catch (error) {
    return (error as NodeJS.ErrnoException).code === 'ESRCH';
  }
}
