/**
 * Times an upload: `npx tsc -b && npx tsx test/bench/upload.bench.ts`. A table of 1,800 × 1,000 float64 as .npy to the built service,
 * from the first byte sent to the answer, against writing (with fsync) and hashing the same bytes in plain Node, in turns.
 */
import { createHash } from 'node:crypto';
import fs from 'node:fs';
import http from 'node:http';
import path from 'node:path';
import { inventedTable } from '../support/invented.ts';
import { startRunningService, temporaryFolder } from '../support/running-service.ts';
import { FORM_TYPE, npyAround, npyHeader, tableForm, withoutValues } from '../support/upload-form.ts';

const [ROWS, COLUMNS] = [1800, 1000];
const REPETITIONS = 11;

/** Another table each time, or nothing would be stored. */
function fileOf(round: number): Buffer {
  const values = Float64Array.from({ length: ROWS * COLUMNS }, (_, k) => 1 + Math.sin(k + round));
  return npyAround(npyHeader(`(${ROWS}, ${COLUMNS})`), new Uint8Array(values.buffer));
}

const description = {
  ...withoutValues(inventedTable()),
  momentum: { unit: 'keV', edges: { start: 0, step: 0.01, count: ROWS + 1 } },
  energy: { unit: 'eV', edges: { start: 0, step: 0.05, count: COLUMNS + 1 } },
};
const folder = temporaryFolder();
const service = await startRunningService({ DATA_DIR: folder });
const agent = new http.Agent({ keepAlive: true });

function upload(form: Buffer): Promise<void> {
  return new Promise((resolve, reject) => {
    const headers = { 'content-type': FORM_TYPE, 'content-length': form.length };
    const request = http.request(`${service.url}/v1/crystals`, { method: 'POST', agent, headers }, (response) => {
      response.resume();
      response.on('end', () =>
        response.statusCode === 201 ? resolve() : reject(new Error(`status ${response.statusCode}`)),
      );
    });
    request.on('error', reject);
    request.end(form);
  });
}

function writeAndHash(bytes: Buffer, round: number): void {
  const descriptor = fs.openSync(path.join(folder, `plain-${round}`), 'w');
  fs.writeFileSync(descriptor, bytes);
  fs.fsyncSync(descriptor);
  fs.closeSync(descriptor);
  createHash('sha256').update(bytes).digest('hex');
}

const times: Record<'plain' | 'upload', number[]> = { plain: [], upload: [] };
for (let round = 0; round < REPETITIONS; round++) {
  const file = fileOf(round);
  const form = tableForm(description, file);
  let began = performance.now();
  writeAndHash(file, round);
  times.plain.push(performance.now() - began);
  began = performance.now();
  await upload(form);
  times.upload.push(performance.now() - began);
}
agent.destroy();
await service.stop();
fs.rmSync(folder, { recursive: true, force: true });

const median = (list: readonly number[]): number => [...list].sort((a, b) => a - b)[Math.floor(list.length / 2)];
const [plain, uploaded] = [median(times.plain), median(times.upload)];
console.log(
  `${ROWS} × ${COLUMNS} float64, medians of ${REPETITIONS}: upload ${uploaded.toFixed(0)} ms (shortest ${Math.min(...times.upload).toFixed(0)}), ` +
    `write + fsync + hash ${plain.toFixed(0)} ms (shortest ${Math.min(...times.plain).toFixed(0)}), ratio ${(uploaded / plain).toFixed(2)}`,
);
