/** Heavy work beside light: what is computed never holds up what only has to be answered. */
import fs from 'node:fs';
import { gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { inventedScenario, inventedTable, largeTable } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { type RunningService, startRunningService, temporaryFolder } from '../support/running-service.ts';

/** A rate that takes a good part of a second: many cells, and a halo nobody asked for before. */
let halos = 0;
const heavy = (id: string) =>
  inventedScenario({ crystal: { id }, halo: { laboratorySpeed: `${200 + halos++ / 8} km/s` }, spectrum: true });

async function stored(service: RunningService, table: unknown): Promise<string> {
  const response = await service.post('/v1/crystals', table);
  expect(response.status).toBe(201);
  return ((await response.json()) as { id: string }).id;
}

async function elapsed<T>(work: () => Promise<T>): Promise<{ milliseconds: number; result: T }> {
  const began = performance.now();
  const result = await work();
  return { milliseconds: performance.now() - began, result };
}

describe('load', () => {
  let service: RunningService;
  let id: string;
  beforeAll(async () => {
    service = await startRunningService({ WORKERS: '1' });
    id = await stored(service, largeTable(2400, 1200));
  });
  afterAll(() => service.stop());

  test('GET /healthz: answers while heavy rates are computed and large tables are read', async () => {
    let busy = true;
    const waits: number[] = [];
    const load = elapsed(async () => {
      const upload = JSON.stringify(largeTable(1500, 1000, 'Other invented numbers'));
      const rates = Array.from({ length: 12 }, () => service.post('/v1/rates', heavy(id)));
      const statusOf = async (answer: Promise<Response>): Promise<number> => {
        const response = await answer;
        await response.arrayBuffer();
        return response.status;
      };
      return Promise.all([...rates, service.post('/v1/crystals', upload)].map(statusOf));
    }).finally(() => {
      busy = false;
    });
    while (busy) {
      const { milliseconds } = await elapsed(async () => {
        const response = await service.get('/healthz');
        expect([response.status, await response.text()]).toEqual([200, '{"status":"ok"}']);
      });
      waits.push(milliseconds);
      await new Promise((resolve) => setTimeout(resolve, 10));
    }
    expect(waits.length).toBeGreaterThan(10);
    // a service that computes on its event loop would keep the slowest waiting for most of the load
    const { milliseconds, result } = await load;
    expect(result).toEqual([...Array(12).fill(200), 201]);
    expect(Math.max(...waits)).toBeLessThan(milliseconds / 3);
  });

  test('POST /v1/rates: closed connections stop their computations', async () => {
    const { milliseconds: one } = await elapsed(async () => (await service.post('/v1/rates', heavy(id))).arrayBuffer());
    const abandoned = 30;
    const controller = new AbortController();
    const given = Array.from({ length: abandoned }, () =>
      service.post('/v1/rates', heavy(id), { signal: controller.signal }).then(
        () => 'answered',
        () => 'abandoned',
      ),
    );
    await new Promise((resolve) => setTimeout(resolve, one / 2));
    controller.abort();
    expect((await Promise.all(given)).filter((end) => end === 'abandoned').length).toBeGreaterThan(abandoned - 3);
    const { milliseconds: next } = await elapsed(async () => {
      const response = await service.post('/v1/rates', heavy(id));
      expect(response.status).toBe(200);
      await response.arrayBuffer();
    });
    // behind all the others it would take 30 times one; a fresh thread must load its code first
    expect(next).toBeLessThan((one * abandoned) / 3);
  });
});

describe('deadline', () => {
  test('POST /v1/rates: past DEADLINE_S it is 503 with Retry-After, and the worker is free again', async () => {
    const dataDir = temporaryFolder();
    const patient = await startRunningService({ WORKERS: '1', DATA_DIR: dataDir });
    const large = await stored(patient, largeTable(2400, 1200));
    const id = await stored(patient, inventedTable());
    await patient.stop();
    const service = await startRunningService({ WORKERS: '1', DATA_DIR: dataDir, DEADLINE_S: '1' });
    const answers = await Promise.all(Array.from({ length: 60 }, () => service.post('/v1/rates', heavy(large))));
    const late = answers.filter(({ status }) => status === 503);
    expect(late.length).toBeGreaterThan(0);
    for (const response of late) {
      expect(response.headers.get('retry-after')).toMatch(/^\d+$/);
      await problemOf(response, 'busy');
    }
    await expect
      .poll(async () => (await service.post('/v1/rates', inventedScenario({ crystal: { id } }))).status, {
        timeout: 20_000,
      })
      .toBe(200);
    await service.stop();
    fs.rmSync(dataDir, { recursive: true, force: true });
  });

  test('POST /v1/rates: a full queue is 503 with Retry-After at once, the rest is served', async () => {
    const service = await startRunningService({ WORKERS: '1', QUEUE: '2' });
    const id = await stored(service, largeTable(2400, 1200));
    const answers = await Promise.all(Array.from({ length: 30 }, () => service.post('/v1/rates', heavy(id))));
    const count = (status: number): number => answers.filter((answer) => answer.status === status).length;
    expect(count(200) + count(503)).toBe(30);
    expect(count(200)).toBeGreaterThan(0);
    expect(count(503)).toBeGreaterThan(0);
    for (const response of answers.filter(({ status }) => status === 503)) {
      expect(response.headers.get('retry-after')).toMatch(/^\d+$/);
      await problemOf(response, 'busy');
    }
    await service.stop();
  });
});

describe('hostile bodies', () => {
  test('POST /v1/rates: after them the next answer is byte for byte the same', async () => {
    const service = await startRunningService({ WORKERS: '2' });
    const scenario = inventedScenario();
    const before = await (await service.post('/v1/rates', scenario)).text();
    const plain = JSON.stringify(scenario);
    const zipped = gzipSync(plain);
    const gzip = { 'content-encoding': 'gzip' };
    const send = (body: string | Uint8Array<ArrayBuffer>, headers: Record<string, string> = {}) =>
      service.post('/v1/rates', null, { body, headers });
    const bytes = (buffer: Uint8Array): Uint8Array<ArrayBuffer> => new Uint8Array(buffer);
    const hostile: readonly (readonly [string, () => Promise<Response>, number])[] = [
      ['truncated JSON', () => send(plain.slice(0, 100)), 400],
      ['200,000 deep', () => send('['.repeat(200_000)), 400],
      ['a million fields', () => send(`{${Array.from({ length: 1e6 }, (_, i) => `"a${i}":1`).join()}}`), 422],
      ['a million numbers', () => send(plain.replace('[1,2,4]', `[${Array(1e6).fill(-1).join()}]`)), 422],
      ['__proto__', () => send(`{"__proto__":{"mass":1},${plain.slice(1)}`), 422],
      ['1e400', () => send(plain.replace('0.3', '1e400')), 422],
      ['a text of 20 MB', () => send(JSON.stringify({ ...scenario, extra: 'x'.repeat(2e7) })), 422],
      ['a truncated archive', () => send(bytes(zipped.subarray(0, 50)), gzip), 400],
      ['garbage after an archive', () => send(bytes(Buffer.concat([zipped, Buffer.from('garbage')])), gzip), 400],
      ['65 MiB', () => send(' '.repeat(65 * 2 ** 20)), 413],
      [
        'a tiny energy per pair',
        () => send(plain.replace('"1.12 eV"', '"1e-9 eV"').replace('"3.8 eV"', '"1e-9 eV"')),
        200,
      ],
    ];
    for (const [what, call, status] of hostile) {
      const response = await call();
      expect([what, response.status]).toEqual([what, status]);
      await response.arrayBuffer();
      expect(await (await service.post('/v1/rates', scenario)).text(), what).toBe(before);
    }
    expect(service.stderr()).toBe('');
    await service.stop();
  });

  const canMeasure = fs.existsSync('/proc/self/status');
  test.skipIf(!canMeasure)('POST /v1/crystals: a gzip bomb of 4 GiB is 413 and never held in memory', async () => {
    const service = await startRunningService({ WORKERS: '1' });
    const peakMib = (): number =>
      Number(/^VmHWM:\s+(\d+) kB/m.exec(fs.readFileSync(`/proc/${service.pid}/status`, 'utf8'))![1]) / 1024;
    const member = gzipSync(Buffer.alloc(64 * 2 ** 20, ' '), { level: 9 });
    const bomb = new Uint8Array(Buffer.concat(Array(64).fill(member)));
    const before = peakMib();
    const response = await service.post('/v1/crystals', null, { body: bomb, headers: { 'content-encoding': 'gzip' } });
    await problemOf(response, 'too-large');
    // the 64 MiB that are allowed, once as pieces, once joined, and what the collector has not seen yet
    expect(peakMib() - before).toBeLessThan(256);
    expect((await service.get('/healthz')).status).toBe(200);
    await service.stop();
  });
});
