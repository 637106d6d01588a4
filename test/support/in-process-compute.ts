/** Compute without threads: the worker's own function, called here. Errors cross as the same facts as between threads. */
import type { Compute } from '../../service/compute/compute.ts';
import { errorOf } from '../../service/compute/failure.ts';
import work from '../../service/compute/worker.ts';

export function inProcessCompute(): Compute {
  return {
    async run(task, input, options = {}) {
      options.signal?.throwIfAborted();
      const answer = await work({ task, input });
      if ('failure' in answer) throw errorOf(answer.failure);
      return answer.value as never;
    },
    workers: 1,
    async close() {},
  };
}
