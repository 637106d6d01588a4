/**
 * The nights on a disk, in a folder of their own:
 *
 * - `RUN/`, one folder a run, named after its time (UTC) and a random suffix. It is written under a temporary name and renamed once all of
 *   it is on the disk: it is there whole or not at all, and never written again.
 * - `reference.json`, which names the accepted run. It is replaced in one step; of two at once the last one stays.
 *
 * Runs share nothing but these two renames, so any number may go on at once, and any may be killed.
 */
import fs from 'node:fs';
import path from 'node:path';
import { z } from 'zod';
import type { NightCurve } from './changed-inputs.ts';
import { NightlyReach } from './reach-answer.ts';

const TEMPORARY = '.part';
const REFERENCE = 'reference.json';
/** A run writes into its folder at least once a curve, and no curve may take a day. */
const STALE_MS = 48 * 3_600_000;
const RUN_NAME = /^\d{8}T\d{6}Z-[0-9a-f]{8}$/;

/** The disk refused, or holds something that is no history. */
export class HistoryError extends Error {}

export interface RunInProgress {
  /** A file of the run; throws HistoryError. */
  write(name: string, text: string): void;
  /** Puts the run into the history, whole; returns its folder. */
  keep(): string;
  /** Leaves nothing behind. */
  discard(): void;
}

export interface Reference {
  readonly run: string;
  readonly curves: ReadonlyMap<string, NightCurve>;
}

export function runName(startedAt: Date, suffix: string): string {
  const name = `${startedAt.toISOString().slice(0, 19).replaceAll(/[-:]/g, '')}Z-${suffix}`;
  if (!RUN_NAME.test(name)) throw new HistoryError(`${name} is no name for a run`);
  return name;
}

/** Starts a run: its folder is there, so a disk that refuses is known before anything is computed. Sweeps what dead runs left. */
export function beginRun(folder: string, name: string, nowMs: number): RunInProgress {
  const temporary = path.join(folder, `.${name}${TEMPORARY}`);
  const told = <T>(action: () => T): T => orHistoryError(folder, action);
  told(() => {
    fs.mkdirSync(folder, { recursive: true });
    sweep(folder, nowMs);
    fs.mkdirSync(temporary);
  });
  return {
    write: (file, text) => told(() => writeWhole(path.join(temporary, file), text)),
    keep: () =>
      told(() => {
        const kept = path.join(folder, name);
        sync(temporary);
        fs.renameSync(temporary, kept);
        sync(folder);
        return kept;
      }),
    discard: () => {
      try {
        fs.rmSync(temporary, { recursive: true, force: true });
      } catch {
        // the disk that refuses this refused the run before; a later one sweeps it
      }
    },
  };
}

/** Makes a run of the history the reference. */
export function accept(folder: string, run: string): void {
  const temporary = path.join(folder, `.${run}.reference${TEMPORARY}`);
  orHistoryError(folder, () => {
    try {
      writeWhole(temporary, `${JSON.stringify({ run })}\n`);
      fs.renameSync(temporary, path.join(folder, REFERENCE));
    } catch (error) {
      fs.rmSync(temporary, { force: true });
      throw error;
    }
    sync(folder);
  });
}

const ReferenceFile = z.looseObject({ run: z.string().regex(RUN_NAME) });
const SummaryFile = z.looseObject({
  curves: z.array(z.looseObject({ name: z.string(), files: z.looseObject({ json: z.string() }) })),
});
const PlanFile = z.looseObject({ curves: z.array(z.looseObject({ name: z.string(), reach: z.unknown() })) });

/** The accepted run; undefined before the first. @throws HistoryError where there is one that cannot be read. */
export function readReference(folder: string): Reference | undefined {
  const file = path.join(folder, REFERENCE);
  if (!orHistoryError(folder, () => fs.existsSync(file))) return undefined;
  const { run } = readJson(file, ReferenceFile);
  const at = (name: string): string => path.join(folder, run, path.basename(name));
  const asked = new Map(readJson(at('plan.json'), PlanFile).curves.map(({ name, reach }) => [name, reach]));
  const curves = readJson(at('summary.json'), SummaryFile).curves.map(
    ({ name, files }) => [name, { asked: asked.get(name), answer: readJson(at(files.json), NightlyReach) }] as const,
  );
  return { run, curves: new Map(curves) };
}

function readJson<S extends z.ZodType>(file: string, schema: S): z.output<S> {
  try {
    return schema.parse(JSON.parse(fs.readFileSync(file, 'utf8').replace(/^\ufeff/, '')));
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? 'it is not what this job writes';
    throw new HistoryError(`the reference cannot be read: ${file}: ${code}`);
  }
}

function writeWhole(file: string, text: string): void {
  const descriptor = fs.openSync(file, 'wx');
  try {
    fs.writeFileSync(descriptor, text);
    fs.fsyncSync(descriptor);
  } finally {
    fs.closeSync(descriptor);
  }
}

/** The names in a folder, and a rename, are on the disk. */
function sync(folder: string): void {
  const descriptor = fs.openSync(folder, 'r');
  try {
    fs.fsyncSync(descriptor);
  } finally {
    fs.closeSync(descriptor);
  }
}

/** Removes what killed runs left half written. */
function sweep(folder: string, nowMs: number): void {
  for (const name of fs.readdirSync(folder)) {
    if (!name.startsWith('.') || !name.endsWith(TEMPORARY)) continue;
    const left = path.join(folder, name);
    try {
      if (nowMs - fs.statSync(left).mtimeMs > STALE_MS) fs.rmSync(left, { recursive: true, force: true });
    } catch {
      // another run swept it
    }
  }
}

const REASONS: Readonly<Record<string, string>> = {
  ENOSPC: 'the disk is full',
  EDQUOT: 'the quota of the disk is used up',
  EROFS: 'the disk is read-only',
  EACCES: 'permission is denied',
  EPERM: 'permission is denied',
  ENOTDIR: 'a file is in the way',
  EEXIST: 'something of that name is in the way',
  // what a recursive mkdir says of a read-only disk
  ENOENT: 'the folder is gone, or the disk is read-only',
};

function orHistoryError<T>(folder: string, action: () => T): T {
  try {
    return action();
  } catch (error) {
    const { code, message } = error as NodeJS.ErrnoException;
    if (code === undefined) throw error;
    throw new HistoryError(`the history in ${folder} cannot be written: ${REASONS[code] ?? message} (${code})`);
  }
}
