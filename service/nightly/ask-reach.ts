/** Asking a service, in this process or elsewhere, for a reach curve, point by point. */
import { setTimeout as pause } from 'node:timers/promises';
import { z } from 'zod';
import type { Fault } from '../problem.ts';
import { NightlyReach } from './reach-answer.ts';

export interface ReachService {
  /** For messages: an address, or that it is this process. */
  readonly name: string;
  request(path: string, init: RequestInit): Promise<Response>;
}

/** Why a curve could not be computed, in words for the operator. */
export class CurveFailure extends Error {
  readonly faults: readonly Fault[];
  constructor(detail: string, faults: readonly Fault[] = []) {
    super(detail);
    this.faults = faults;
  }
}

export interface Asking {
  /** Called as each point comes in, with how many there are. */
  readonly onPoint: (points: number) => void;
  readonly signal: AbortSignal;
}

/** @throws CurveFailure, or the signal's reason. */
export async function askReach(service: ReachService, asked: unknown, asking: Asking): Promise<NightlyReach> {
  try {
    const streamed = await streamedAnswer(service, asked, asking);
    if (streamed) return answerOf(streamed);
    // a stream that breaks off cannot say why; the whole answer, or the problem in its place, does
    const response = await post(service, asked, 'application/json', asking.signal, 1);
    return answerOf(await response.json());
  } catch (error) {
    asking.signal.throwIfAborted();
    throw error instanceof CurveFailure ? error : failureOf(service, error);
  }
}

/** Undefined where the stream ends before its last line. */
async function streamedAnswer(service: ReachService, asked: unknown, asking: Asking): Promise<object | undefined> {
  const response = await post(service, asked, 'application/x-ndjson', asking.signal);
  const points: unknown[] = [];
  try {
    for await (const line of linesOf(response)) {
      const row = JSON.parse(line) as object;
      if ('provenance' in row) return { points, ...row };
      points.push(row);
      asking.onPoint(points.length);
    }
  } catch {
    asking.signal.throwIfAborted();
  }
  return undefined;
}

async function* linesOf({ body }: Response): AsyncGenerator<string> {
  const decoder = new TextDecoder();
  let rest = '';
  for await (const chunk of body ?? []) {
    const lines = (rest + decoder.decode(chunk as Uint8Array, { stream: true })).split('\n');
    rest = lines.pop()!;
    yield* lines;
  }
}

const MOST_TRIES = 4;
const LONGEST_PAUSE_S = 60;

/** The answer if it is a 200; a busy service is asked again when it says. */
async function post(
  service: ReachService,
  asked: unknown,
  accept: string,
  signal: AbortSignal,
  mostTries = MOST_TRIES,
): Promise<Response> {
  for (let tries = 1; ; tries++) {
    signal.throwIfAborted();
    const response = await service.request('/v1/reach', {
      method: 'POST',
      headers: { 'content-type': 'application/json', accept },
      body: JSON.stringify(asked),
      signal,
    });
    if (response.ok) return response;
    const text = await response.text();
    if (response.status !== 503 || tries === mostTries) throw problemOf(response.status, text);
    const seconds = Number(response.headers.get('retry-after') ?? 1);
    await pause(1e3 * Math.min(LONGEST_PAUSE_S, seconds >= 0 ? seconds : 1), undefined, { signal });
  }
}

const ProblemBody = z.looseObject({
  detail: z.string(),
  errors: z.array(z.looseObject({ pointer: z.string().optional(), detail: z.string() })).default([]),
});

function problemOf(status: number, text: string): CurveFailure {
  const problem = ProblemBody.safeParse(jsonOf(text));
  if (!problem.success) return new CurveFailure(`the service answered with status ${status} and no problem of its own`);
  const faults = problem.data.errors.map(({ pointer = '', detail }) => ({ pointer, detail: oneLine(detail) }));
  return new CurveFailure(`${oneLine(problem.data.detail)} (status ${status})`, faults);
}

function jsonOf(text: string): unknown {
  try {
    return JSON.parse(text);
  } catch {
    return undefined;
  }
}

function answerOf(answer: unknown): NightlyReach {
  const result = NightlyReach.safeParse(answer);
  if (result.success) return answer as NightlyReach; // as it came, in its own order
  const { path, message } = result.error.issues[0];
  throw new CurveFailure(`the service answered something that is no reach: ${path.join('/')}: ${message}`);
}

function failureOf({ name }: ReachService, error: unknown): CurveFailure {
  const { cause, message } = error as Error & { cause?: NodeJS.ErrnoException };
  return cause === undefined
    ? new CurveFailure(`${name} gives no answer that can be read: ${oneLine(message)}`)
    : new CurveFailure(`${name} cannot be reached: ${cause.code ?? oneLine(cause.message)}`);
}

/** Text of a stranger on a terminal: no control characters. */
function oneLine(text: string): string {
  return text.replace(/[\p{Cc}\u2028\u2029]+/gu, ' ');
}

/** @throws CurveFailure where nothing answers at all: then no curve needs to be tried. */
export async function requireService(service: ReachService, signal: AbortSignal): Promise<void> {
  try {
    await (await service.request('/healthz', { signal })).arrayBuffer();
  } catch (error) {
    signal.throwIfAborted();
    throw failureOf(service, error);
  }
}
