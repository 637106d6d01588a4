/** The nightly job as a command: from its words and the environment to an exit code. */
import fs from 'node:fs';
import path from 'node:path';
import { type Config, ConfigError, configOf } from '../config.ts';
import { createLog } from '../log.ts';
import { CurveFailure, type ReachService, requireService } from './ask-reach.ts';
import { type CommandLine, commandLineOf, USAGE, UsageError } from './command-line.ts';
import { HistoryError } from './history.ts';
import { type Plan, PlanError, planOf } from './plan.ts';
import { progressOn } from './progress.ts';
import { runNight } from './run-night.ts';
import { type ExitCode, faultInWords } from './summary.ts';

/** What the command touches of the world. */
export interface World {
  readonly environment: Readonly<Record<string, string | undefined>>;
  readonly stdout: { write(text: string): unknown };
  readonly stderr: Parameters<typeof progressOn>[0];
  readonly now: () => Date;
  /** Eight hexadecimal digits that no other run has. */
  readonly suffix: () => string;
  /** Ends when the job is to stop; its reason says why. */
  readonly signal: AbortSignal;
}

/** Why a job was stopped from outside. */
export class Stopped extends Error {}

export async function nightly(words: readonly string[], world: World): Promise<ExitCode> {
  const tell = (...lines: string[]): void => void world.stderr.write(lines.map((line) => `${line}\n`).join(''));
  try {
    const line = commandLineOf(words);
    if (line) return await night(line, world);
    world.stdout.write(USAGE);
    return 0;
  } catch (error) {
    if (error instanceof UsageError) tell(error.message, '', USAGE.trimEnd());
    else if (error instanceof PlanError)
      tell(error.message, ...error.faults.map((fault) => `  ${faultInWords(fault)}`));
    else if (isExpected(error)) tell(`The nightly job could not run: ${error.message}`);
    else tell(`The nightly job failed: ${(error as Error).stack ?? String(error)}`);
    return 2;
  }
}

function isExpected(error: unknown): error is Error {
  return [HistoryError, CurveFailure, ConfigError, Stopped].some((kind) => error instanceof kind);
}

async function night(line: CommandLine, world: World): Promise<ExitCode> {
  const config = configFor(line, world.environment);
  const plan = planAt(line.planFile);
  const progress = progressOn(world.stderr, plan.curves.length, line.quiet);
  const { service, close } = await serviceFor(line, config, world.signal);
  try {
    const result = await runNight({
      plan,
      service,
      folder: path.join(config.dataDir, 'nightly'),
      startedAt: world.now(),
      suffix: world.suffix(),
      accept: line.accept,
      progress,
      signal: world.signal,
    });
    progress.end();
    world.stdout.write(`${result.lines.join('\n')}\n`);
    return result.exitCode;
  } catch (error) {
    progress.end();
    throw error;
  } finally {
    await close();
  }
}

/** A curve may take as long as it takes, and a log of every request is no news at night; whoever sets these has it their way. */
function configFor({ dataDir }: CommandLine, environment: World['environment']): Config {
  return configOf({
    ...environment,
    DEADLINE_S: environment['DEADLINE_S'] || '86400',
    LOG_LEVEL: environment['LOG_LEVEL'] || 'warn',
    ...(dataDir === undefined ? {} : { DATA_DIR: dataDir }),
  });
}

function planAt(file: string): Plan {
  let text: string;
  try {
    text = fs.readFileSync(file, 'utf8');
  } catch (error) {
    throw new PlanError(`The plan ${file} cannot be read: ${(error as NodeJS.ErrnoException).code}.`);
  }
  return planOf(text);
}

async function serviceFor(
  { url }: CommandLine,
  config: Config,
  signal: AbortSignal,
): Promise<{ service: ReachService; close: () => Promise<void> }> {
  if (url !== undefined) {
    const service = { name: url, request: (at: string, init: RequestInit) => fetch(url + at, init) };
    await requireService(service, signal);
    return { service, close: async () => {} };
  }
  const { startService } = await import('../start.ts'); // a job that asks elsewhere has no need of it
  const { app, close } = await startService(config, createLog(config.logLevel));
  const service = {
    name: 'this process',
    request: async (at: string, init: RequestInit) => app.fetch(new Request(`http://in-process${at}`, init)),
  };
  return { service, close };
}
