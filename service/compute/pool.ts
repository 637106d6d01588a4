/**
 * The worker pool: a bounded queue before a fixed number of threads. A computation is stopped by ending its thread, so a timer
 * or a closed connection takes effect in the middle of a loop.
 */
import { fileURLToPath } from 'node:url';
import { Piscina } from 'piscina';
import { Problem } from '../problem.ts';
import type { Compute } from './compute.ts';
import { errorOf } from './failure.ts';
import type { WorkerAnswer } from './worker.ts';

/** Sources run under a TypeScript loader, the built service as it is: the worker is whichever this file is. */
const OWN_ENDING = import.meta.url.endsWith('.ts') ? 'ts' : 'js';
const WORKER = fileURLToPath(new URL(`./worker.${OWN_ENDING}`, import.meta.url));

export interface PoolOptions {
  readonly workers: number;
  /** Jobs that may wait; one more is refused. */
  readonly queue: number;
}

export function computePool({ workers, queue }: PoolOptions): Compute {
  const pool = new Piscina({
    filename: WORKER,
    minThreads: workers,
    maxThreads: workers,
    idleTimeout: Number.POSITIVE_INFINITY,
    ...(OWN_ENDING === 'ts' ? { execArgv: ['--import', 'tsx'] } : {}),
  });
  // counted here: piscina's own bound does not see jobs that carry a signal
  const mostJobs = workers + queue;
  let jobs = 0;
  return {
    workers,
    async run(task, input, options = {}) {
      if (jobs >= mostJobs) throw new Problem('busy', 'Too many computations are waiting.', [], { 'Retry-After': '1' });
      jobs++;
      let answer: WorkerAnswer;
      try {
        answer = (await pool.run({ task, input }, options.signal ? { signal: options.signal } : {})) as WorkerAnswer;
      } catch (error) {
        if (options.signal?.aborted) throw options.signal.reason;
        throw error;
      } finally {
        jobs--;
      }
      if ('failure' in answer) throw errorOf(answer.failure);
      return answer.value as never;
    },
    close: () => pool.destroy(),
  };
}
