/** One night: every curve of the plan computed, held against the accepted run, and written into the history. */
import { DomainError } from '../../physics/errors.ts';
import { askReach, CurveFailure, type ReachService } from './ask-reach.ts';
import { compareNights } from './compare-night.ts';
import { type CurveFiles, type CurveToWrite, fileNames, fileTexts } from './curve-files.ts';
import {
  accept,
  beginRun,
  HistoryError,
  type Reference,
  type RunInProgress,
  readReference,
  runName,
} from './history.ts';
import type { Plan } from './plan.ts';
import type { Progress } from './progress.ts';
import {
  type CurveOutcome,
  type ExitCode,
  exitCodeOf,
  type Night,
  outcomeInWords,
  summaryJson,
  summaryLines,
  summaryMarkdown,
} from './summary.ts';

export interface NightJob {
  readonly plan: Plan;
  readonly service: ReachService;
  /** Where the history is. */
  readonly folder: string;
  readonly startedAt: Date;
  /** Eight hexadecimal digits that no other run has. */
  readonly suffix: string;
  readonly accept: boolean;
  readonly progress: Progress;
  /** Its end leaves the history as it was. */
  readonly signal: AbortSignal;
}

export interface NightResult {
  readonly exitCode: ExitCode;
  readonly lines: readonly string[];
  readonly run: string;
  readonly folder: string;
}

/** @throws HistoryError where the disk refuses, the signal's reason where it ends. */
export async function runNight(job: NightJob): Promise<NightResult> {
  const name = runName(job.startedAt, job.suffix);
  const { reference, warnings } = referenceFor(job);
  const run = beginRun(job.folder, name, job.startedAt.getTime());
  try {
    const night = await computeNight(job, name, reference, run);
    // from here to the end without a pause: no signal comes in between
    run.write('plan.json', job.plan.text);
    run.write('summary.json', summaryJson(night));
    run.write('summary.md', summaryMarkdown(night));
    const folder = run.keep();
    const lines = [...warnings, ...summaryLines(night), ...acceptedLines(job, night), `Files: ${folder}`];
    return { exitCode: exitCodeOf(night), lines, run: name, folder };
  } finally {
    run.discard(); // what was kept has another name by now
  }
}

/** A reference that cannot be read ends the night before it begins, unless tonight is to replace it. */
function referenceFor(job: NightJob): { reference: Reference | undefined; warnings: string[] } {
  try {
    return { reference: readReference(job.folder), warnings: [] };
  } catch (error) {
    if (!(error instanceof HistoryError)) throw error;
    if (job.accept) return { reference: undefined, warnings: [`Note: ${error.message}`] };
    throw new HistoryError(`${error.message}; --accept makes tonight the reference`);
  }
}

async function computeNight(
  job: NightJob,
  name: string,
  reference: Reference | undefined,
  run: RunInProgress,
): Promise<Night> {
  const outcomes: CurveOutcome[] = [];
  for (const [i, curve] of job.plan.curves.entries()) {
    job.progress.curve(curve.name, curve.masses);
    const outcome = await outcomeOf(job, i, name, reference, run);
    job.signal.throwIfAborted();
    job.progress.curveDone(outcomeInWords(outcome));
    outcomes.push(outcome);
  }
  const planned = new Set(job.plan.curves.map((curve) => curve.name));
  return {
    run: name,
    startedAt: job.startedAt,
    service: job.service.name,
    reference: reference?.run,
    outcomes,
    gone: [...(reference?.curves.keys() ?? [])].filter((curve) => !planned.has(curve)),
  };
}

async function outcomeOf(
  { plan, service, progress, signal }: NightJob,
  i: number,
  run: string,
  reference: Reference | undefined,
  { write }: RunInProgress,
): Promise<CurveOutcome> {
  const curve = plan.curves[i];
  try {
    const answer = await askReach(service, curve.asked, { onPoint: (points) => progress.points(points), signal });
    const written = withReference({ curve, run, answer }, reference);
    const files = writeFiles(written, write);
    if (!written.reference) return { state: 'new', curve, files };
    const { compared } = written.reference;
    return { state: compared.moved ? 'moved' : 'same', curve, files, compared };
  } catch (error) {
    return { state: 'failed', curve, ...failureOf(error, i) };
  }
}

function withReference(written: CurveToWrite, reference: Reference | undefined): CurveToWrite {
  const { curve, answer } = written;
  const before = reference?.curves.get(curve.name);
  if (!reference || !before) return written;
  const compared = compareNights(before, { asked: curve.asked, answer }, curve.tolerance);
  return { ...written, reference: { run: reference.run, curve: before, compared } };
}

function writeFiles(written: CurveToWrite, write: RunInProgress['write']): CurveFiles {
  const names = fileNames(written.curve.stem, written.reference !== undefined);
  const texts = fileTexts(written);
  for (const [key, text] of Object.entries(texts)) write(names[key as keyof CurveFiles]!, text);
  return names;
}

/** One curve's own failure, its pointers from the top of the plan; anything else ends the night. */
function failureOf(error: unknown, i: number): Pick<CurveFailure, 'faults'> & { detail: string } {
  if (error instanceof CurveFailure) {
    const faults = error.faults.map((fault) => ({
      ...fault,
      pointer: `/curves/${i}/reach${fault.pointer}`,
    }));
    return { detail: error.message, faults };
  }
  if (!(error instanceof DomainError)) throw error;
  const detail = `${error.parameter.join('/')} must be ${error.allowed}; got ${String(error.value)}`;
  return { detail: `the curve cannot be compared or drawn: ${detail}`, faults: [] };
}

/** Makes tonight the reference where that was asked for and every curve is there. */
function acceptedLines(job: NightJob, night: Night): string[] {
  if (!job.accept) return [];
  if (exitCodeOf(night) === 2)
    return ['Not accepted: the reference needs every curve of the plan; it stays as it was.'];
  accept(job.folder, night.run);
  return [`Accepted: ${night.run} is the reference from now on.`];
}
