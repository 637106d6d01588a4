/**
 * Entry of the thread that reads one HDF5 file and ends: an upload that breaks the library's memory breaks no other, and what
 * that memory grew to is given back.
 */
import { parentPort, workerData } from 'node:worker_threads';
import { failureOf } from '../../compute/failure.ts';
import { type Hdf5Job, readDatasets } from './hdf5-datasets.ts';

const answer = await readDatasets(workerData as Hdf5Job).then(
  (value) => ({ value }),
  (error: unknown) => ({ failure: failureOf(error) }),
);
parentPort!.postMessage(answer);
