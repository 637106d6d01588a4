/** A values file as HDF5, read in a thread of its own (hdf5-thread). */
import { once } from 'node:events';
import { Worker } from 'node:worker_threads';
import { errorOf, type Failure } from '../../compute/failure.ts';
import type { Hdf5Job } from './hdf5-datasets.ts';
import { faultyValues, type ReadValues } from './values-part.ts';

export const HDF5_MAGIC = Buffer.from('\x89HDF\r\n\x1a\n', 'latin1');

const OWN_ENDING = import.meta.url.endsWith('.ts') ? 'ts' : 'js';
const THREAD = JSON.stringify(new URL(`./hdf5-thread.${OWN_ENDING}`, import.meta.url).href);
/** Sources run under a TypeScript loader, the built service as it is; a thread takes the loader no other way. */
const START =
  OWN_ENDING === 'ts'
    ? `import(${JSON.stringify(import.meta.resolve('tsx/esm/api'))}).then(({ tsImport }) => tsImport(${THREAD}, ${THREAD}))`
    : `import(${THREAD})`;

export async function readHdf5(job: Hdf5Job): Promise<ReadValues> {
  const thread = new Worker(START, {
    eval: true,
    workerData: job,
    execArgv: [],
    stdout: true,
    stderr: true,
  });
  for (const words of [thread.stdout, thread.stderr]) words.resume(); // the library's diagnostics are no log of ours
  try {
    const [answer] = (await Promise.race([once(thread, 'message'), ended(thread)])) as [
      { readonly value: ReadValues } | { readonly failure: Failure },
    ];
    if (!('failure' in answer)) return answer.value;
    const error = errorOf(answer.failure);
    throw isOfTheFile(answer.failure) ? faultyValues('cannot be read as HDF5') : error;
  } finally {
    await thread.terminate();
  }
}

/** A thread that ends without an answer was ended by what it read. */
async function ended(thread: Worker): Promise<never> {
  await once(thread, 'exit');
  throw faultyValues('cannot be read as HDF5');
}

/** What the library throws is no fault of ours; a system error is. */
function isOfTheFile(failure: Failure): boolean {
  return failure.kind === 'other' && failure.code === undefined;
}
