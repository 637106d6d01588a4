/** The built service as a process: its start, its end, and what it says when it cannot start. */
import net from 'node:net';
import { afterAll, describe, expect, test } from 'vitest';
import { inventedScenario, inventedTable, largeTable } from '../support/invented.ts';
import { type RunningService, runToEnd, startRunningService } from '../support/running-service.ts';

const running: RunningService[] = [];
afterAll(() => Promise.all(running.map((service) => service.stop())));
async function start(environment: Record<string, string> = {}): Promise<RunningService> {
  const service = await startRunningService(environment);
  running.push(service);
  return service;
}

describe('start', () => {
  test('main.js: prints one line with its address once it is ready, and serves there', async () => {
    const service = await start();
    expect(service.stdout()).toMatch(/^\S[^\n]*http:\/\/127\.0\.0\.1:\d+\n$/);
    expect((await service.get('/readyz')).status).toBe(200);
    expect((await service.get('/healthz')).status).toBe(200);
    const { crystals } = (await (await service.get('/v1/crystals')).json()) as { crystals: { aliases: string[] }[] };
    expect(crystals.map(({ aliases }) => aliases[0])).toContain('silicon');
    expect((await service.post('/v1/rates', inventedScenario({ crystal: { id: 'silicon' } }))).status).toBe(200);
    expect(service.stdout().split('\n')).toHaveLength(2);
    expect(service.stderr()).toBe('');
  });

  test('main.js: two replicas answer the same request with the same bytes', async () => {
    const [one, other] = await Promise.all([start({ WORKERS: '1' }), start({ WORKERS: '2' })]);
    const scenario = inventedScenario({
      crystal: { id: 'silicon' },
      spectrum: true,
      goal: { kind: 'events', count: 3 },
    });
    const texts = await Promise.all([one, other].map(async (s) => (await s.post('/v1/rates', scenario)).text()));
    expect(texts[0]).toBe(texts[1]);
    expect(JSON.parse(texts[0])).toHaveProperty('exposure');
  });

  test('main.js: a port in use is told plainly, exit code 1', async () => {
    const server = net.createServer().listen(0, '127.0.0.1');
    await new Promise((resolve) => server.once('listening', resolve));
    const { port } = server.address() as net.AddressInfo;
    const { code, stdout, stderr } = await runToEnd({ PORT: String(port) });
    server.close();
    expect([code, stdout]).toEqual([1, '']);
    expect(stderr).toContain(`127.0.0.1:${port}`);
    expect(stderr).toContain('EADDRINUSE');
    expect(stderr).not.toMatch(/\n\s+at /);
  });

  test('main.js: a bad configuration tells every fault, exit code 2', async () => {
    const { code, stdout, stderr } = await runToEnd({
      PORT: 'http',
      WORKERS: '0',
      DEADLINE_S: '-1',
      CORS_ORIGINS: 'x',
    });
    expect([code, stdout]).toEqual([2, '']);
    for (const name of ['PORT', 'WORKERS', 'DEADLINE_S', 'CORS_ORIGINS']) expect(stderr).toContain(name);
    expect(stderr).not.toMatch(/\n\s+at /);
  });
});

describe('SIGTERM', () => {
  test('SIGTERM: twice, what is in flight finishes, exit code 0', async () => {
    const service = await start({ WORKERS: '1' });
    const stored = await service.post('/v1/crystals', largeTable(1500, 1000));
    const { id } = (await stored.json()) as { id: string };
    const answers = Array.from({ length: 4 }, (_, i) =>
      service.post(
        '/v1/rates',
        inventedScenario({ crystal: { id }, halo: { laboratorySpeed: `${200 + i} km/s` }, spectrum: true }),
      ),
    );
    // the last one waits behind the others: it is surely unfinished when the first answers
    await answers[0];
    service.kill('SIGTERM');
    service.kill('SIGTERM');
    const finished = await Promise.all(
      answers.map(async (answer) => [(await answer).status, await (await answer).json()]),
    );
    expect(finished.map(([status]) => status)).toEqual([200, 200, 200, 200]);
    expect(await service.exited).toEqual({ code: 0, signal: null });
    await expect(service.get('/healthz')).rejects.toThrow();
  });

  test('SIGTERM: an idle service ends at once with 0, and SIGINT does the same', async () => {
    for (const signal of ['SIGTERM', 'SIGINT'] as const) {
      const service = await start();
      await (await service.post('/v1/crystals', inventedTable())).text();
      service.kill(signal);
      expect(await service.exited).toEqual({ code: 0, signal: null });
    }
  });

  test('SIGTERM: a connection kept open has its answer, no new work is taken on it, and it is closed', async () => {
    const service = await start({ WORKERS: '1' });
    const { id } = (await (await service.post('/v1/crystals', largeTable(1500, 1000))).json()) as { id: string };
    const port = Number(new URL(service.url).port);
    const post = (scenario: object): string => {
      const body = JSON.stringify(scenario);
      const length = Buffer.byteLength(body);
      return `POST /v1/rates HTTP/1.1\r\nHost: x\r\nContent-Type: application/json\r\nContent-Length: ${length}\r\n\r\n${body}`;
    };
    const later = ['GET /readyz HTTP/1.1\r\nHost: x\r\n\r\n', post(inventedScenario())];
    const connections = later.map((request) => {
      const socket = net.connect(port, '127.0.0.1');
      let seen = '';
      socket.setEncoding('utf8').on('data', (text: string) => {
        seen += text;
      });
      const closed = new Promise<string>((resolve) => socket.once('close', () => resolve(seen)));
      // what is in flight keeps the connection open; its follower is handed over while the service drains
      socket.write(post(inventedScenario({ crystal: { id }, spectrum: true })));
      return { request, socket, closed };
    });
    await service.get('/healthz');
    service.kill('SIGTERM');
    const state = () =>
      service.get('/healthz').then(
        () => 'open',
        () => 'shut',
      );
    await expect.poll(state, { timeout: 10_000 }).toBe('shut');
    for (const { request, socket } of connections) socket.write(request);
    for (const { closed } of connections) {
      const statuses = [...(await closed).matchAll(/^HTTP\/1\.1 (\d+)/gm)].map((match) => match[1]);
      // the follower meets a closed connection or a refusal, never new work
      expect(statuses[0]).toBe('200');
      expect(statuses.slice(1).filter((status) => status !== '503')).toEqual([]);
    }
    expect(await service.exited).toEqual({ code: 0, signal: null });
  });
});
