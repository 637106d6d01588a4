/** The interface to heavy work: the worker pool in the service, the same functions called in-process in a test. */
import type { TaskInput, TaskName, TaskOutput } from './tasks.ts';

export interface RunOptions {
  /** Aborting it stops the work, even in the middle of a computation. */
  readonly signal?: AbortSignal;
}

export interface Compute {
  /** Threads; more jobs than these wait. */
  readonly workers: number;
  run<N extends TaskName>(task: N, input: TaskInput<N>, options?: RunOptions): Promise<Awaited<TaskOutput<N>>>;
  close(): Promise<void>;
}
