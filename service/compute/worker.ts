/** Entry of a worker thread. Errors cross the thread boundary as facts: cloning would lose their class. */
import { type Failure, failureOf } from './failure.ts';
import { TASKS, type TaskName } from './tasks.ts';

export type WorkerAnswer = { readonly value: unknown } | { readonly failure: Failure };

export default async function work({ task, input }: { task: TaskName; input: unknown }): Promise<WorkerAnswer> {
  try {
    return { value: await (TASKS[task] as (input: unknown) => unknown)(input) };
  } catch (error) {
    return { failure: failureOf(error) };
  }
}
