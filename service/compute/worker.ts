/** Entry of a worker thread. Errors cross the thread boundary as facts: cloning would lose their class. */
import { type Failure, failureOf } from './failure.ts';
import { TASKS, type TaskName } from './tasks.ts';

export type WorkerAnswer = { readonly value: unknown } | { readonly failure: Failure };

export default function work({ task, input }: { task: TaskName; input: unknown }): WorkerAnswer {
  try {
    return { value: (TASKS[task] as (input: unknown) => unknown)(input) };
  } catch (error) {
    return { failure: failureOf(error) };
  }
}
