/** Large uploads to the built service: what they cost in memory, and what is left when they do not come to an end. */
import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import http from 'node:http';
import path from 'node:path';
import { gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { inventedTable } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { type RunningService, startRunningService, temporaryFolder } from '../support/running-service.ts';
import { smallDisk } from '../support/small-disk.ts';
import { FORM_TYPE, hdf5Of, npyHeader, npyOf, tableForm, withoutValues } from '../support/upload-form.ts';

const MIB = 2 ** 20;
const folders: string[] = [];
const running: RunningService[] = [];
async function start(environment: Record<string, string> = {}): Promise<RunningService> {
  const service = await startRunningService({ WORKERS: '1', ...environment });
  running.push(service);
  return service;
}
const folder = (): string => {
  folders.push(temporaryFolder());
  return folders[folders.length - 1];
};
afterAll(async () => {
  await Promise.all(running.map((service) => service.stop()));
  for (const each of folders) fs.rmSync(each, { recursive: true, force: true });
});

const said = withoutValues(inventedTable());
const matrix = [
  [0.5, 0.25, 3],
  [0, 1.5, 2],
];
const uploadsOf = ({ dataDir }: RunningService): string[] => {
  const uploads = path.join(dataDir, 'uploads');
  return fs.existsSync(uploads) ? fs.readdirSync(uploads, { recursive: true, encoding: 'utf8' }) : [];
};

/** The description of a table of rows × columns and the beginning of its file: what follows are the numbers. */
function largeForm(rows: number, columns: number): { readonly head: Buffer; readonly tail: Buffer } {
  const description = {
    ...said,
    momentum: { unit: 'keV', edges: { start: 0, step: 0.01, count: rows + 1 } },
    energy: { unit: 'eV', edges: { start: 0, step: 0.01, count: columns + 1 } },
  };
  const text = npyHeader(`(${rows}, ${columns})`);
  const head = Buffer.from([0x93, ...Buffer.from('NUMPY'), 1, 0, text.length & 0xff, text.length >> 8]);
  const whole = tableForm(description, Buffer.concat([head, Buffer.from(text), Buffer.from('NUMBERS')]));
  const at = whole.indexOf('NUMBERS');
  return { head: whole.subarray(0, at), tail: whole.subarray(at + 7) };
}

/** A mebibyte of numbers, invented. */
const PIECE = Buffer.from(Float64Array.from({ length: MIB / 8 }, (_, i) => (i % 1000) / 1000).buffer);

interface Sending {
  readonly request: http.ClientRequest;
  readonly answer: Promise<{ status: number; text: string }>;
}

function send(service: RunningService, headers: http.OutgoingHttpHeaders = {}): Sending {
  const request = http.request(`${service.url}/v1/crystals`, {
    method: 'POST',
    headers: { 'content-type': FORM_TYPE, ...headers },
  });
  const answer = new Promise<{ status: number; text: string }>((resolve, reject) => {
    request.on('error', reject);
    request.on('response', (response) => {
      let text = '';
      response.setEncoding('utf8').on('data', (piece: string) => {
        text += piece;
      });
      response.on('end', () => resolve({ status: response.statusCode!, text }));
    });
  });
  answer.catch(() => undefined);
  return { request, answer };
}

const written = (request: http.ClientRequest, bytes: Uint8Array): Promise<void> =>
  new Promise((resolve, reject) => request.write(bytes, (error) => (error ? reject(error) : resolve())));

const eventually = async (isSo: () => boolean): Promise<void> => {
  for (let tries = 0; tries < 200 && !isSo(); tries++) await new Promise((resolve) => setTimeout(resolve, 25));
  expect(isSo()).toBe(true);
};

/** Memory of a process in MiB: now, or the most there ever was. */
function memoryOf(pid: number, which: 'VmRSS' | 'VmHWM'): number {
  const status = fs.readFileSync(`/proc/${pid}/status`, 'utf8');
  return Number(new RegExp(`${which}:\\s+(\\d+) kB`).exec(status)![1]) / 1024;
}

describe('large uploads', () => {
  test('POST /v1/crystals: 200 MiB of .npy cost no more memory than the table and 200 MiB, and hold nobody up', async () => {
    const service = await start();
    const [rows, columns] = [5120, 5120]; // 200 MiB
    const form = largeForm(rows, columns);
    const small = tableForm(said, npyOf(matrix));
    const warm = await fetch(`${service.url}/v1/crystals`, {
      method: 'POST',
      body: new Uint8Array(small),
      headers: { 'content-type': FORM_TYPE },
    });
    expect(warm.status).toBe(201);
    const before = memoryOf(service.pid, 'VmRSS');
    const { request, answer } = send(service, { 'content-length': form.head.length + 200 * MIB + form.tail.length });
    let isOver = false;
    void answer.finally(() => {
      isOver = true;
    });
    const waits: number[] = [];
    const watch = (async () => {
      while (!isOver) {
        const began = performance.now();
        expect((await service.get('/healthz')).status).toBe(200);
        waits.push(performance.now() - began);
        await new Promise((resolve) => setTimeout(resolve, 20));
      }
    })();
    await written(request, form.head);
    for (let k = 0; k < 200; k++) await written(request, PIECE);
    const received = memoryOf(service.pid, 'VmHWM') - before;
    request.end(form.tail);
    const { status, text } = await answer;
    await watch;
    expect(status, text.slice(0, 500)).toBe(201);
    const rise = memoryOf(service.pid, 'VmHWM') - before;
    const slowest = waits.sort((a, b) => a - b)[waits.length - 1];
    console.log(
      `memory: ${received.toFixed(0)} MiB while received, ${rise.toFixed(0)} MiB in all; slowest /healthz ${slowest.toFixed(0)} ms of ${waits.length}`,
    );
    expect(received).toBeLessThan(200);
    expect(rise).toBeLessThan(400);
    expect(uploadsOf(service)).toEqual([]);
    await service.stop();
  }, 120_000);

  test('POST /v1/crystals: a bomb of 300 MiB in 300 kB costs no memory to speak of', async () => {
    const service = await start();
    const before = memoryOf(service.pid, 'VmRSS');
    const form = tableForm(said, gzipSync(Buffer.alloc(300 * MIB)));
    expect(form.length).toBeLessThan(MIB);
    const { request, answer } = send(service);
    request.end(form);
    expect((await answer).status).toBe(413);
    expect(memoryOf(service.pid, 'VmHWM') - before).toBeLessThan(150);
    expect(uploadsOf(service)).toEqual([]);
  });

  test('POST /v1/crystals: HDF5 in the built service, and a broken one after it', async () => {
    const service = await start();
    const file = await hdf5Of((h5) =>
      h5.create_dataset({ name: 'v', data: Float64Array.from(matrix.flat()), shape: [2, 3] }),
    );
    for (const [bytes, status] of [
      [file, 201],
      [file.subarray(0, 500), 422],
      [file, 200],
    ] as const) {
      const { request, answer } = send(service);
      request.end(tableForm(said, bytes));
      expect((await answer).status).toBe(status);
    }
    expect(service.stderr()).toBe('');
  });
});

describe('uploads that do not come to an end', () => {
  let service: RunningService;
  const dataDir = folder();
  beforeAll(async () => {
    service = await start({ DATA_DIR: dataDir });
  });

  async function half(at: RunningService): Promise<Sending> {
    const sending = send(at);
    await written(sending.request, largeForm(1280, 1024).head);
    for (let k = 0; k < 5; k++) await written(sending.request, PIECE);
    await eventually(() => uploadsOf(at).some((name) => name.endsWith('values')));
    return sending;
  }

  test('POST /v1/crystals: a caller who leaves takes the file with him', async () => {
    const { request } = await half(service);
    request.destroy();
    await eventually(() => uploadsOf(service).length === 0);
    expect((await service.get('/healthz')).status).toBe(200);
  });

  test('POST /v1/crystals: what kill −9 leaves is gone at the next start; what another process receives is not', async () => {
    await half(service);
    const beside = await start({ DATA_DIR: dataDir });
    expect(uploadsOf(service)).not.toEqual([]);
    service.kill('SIGKILL');
    await service.exited;
    expect(uploadsOf(service)).not.toEqual([]);
    const { request } = await half(beside);
    const next = await start({ DATA_DIR: dataDir });
    expect(uploadsOf(next).filter((name) => name.endsWith('values'))).toHaveLength(1);
    request.destroy();
    await eventually(() => uploadsOf(next).length === 0);
  });

  const mounted = smallDisk(folder(), '2m');
  afterAll(() => {
    if (mounted) execFileSync('umount', ['-l', mounted]);
  });

  test.skipIf(!mounted)('POST /v1/crystals: 507 on a full disk, nothing left, and room again after', async () => {
    const full = await start({ DATA_DIR: mounted! });
    const form = largeForm(1280, 1024);
    const large = Buffer.concat([form.head, ...Array.from({ length: 10 }, () => PIECE), form.tail]);
    const post = (bytes: Buffer): Promise<Response> =>
      fetch(`${full.url}/v1/crystals`, {
        method: 'POST',
        body: new Uint8Array(bytes),
        headers: { 'content-type': FORM_TYPE },
      });
    await problemOf(await post(large), 'storage-full');
    expect(uploadsOf(full)).toEqual([]);
    expect((await post(tableForm(said, npyOf(matrix)))).status).toBe(201);
  });
});
