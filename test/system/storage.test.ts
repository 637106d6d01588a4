/** Tables on a disk: whole or not at all, whatever happens to the process, the file or the disk. */
import { execFileSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import fs from 'node:fs';
import path from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import { inventedScenario, inventedTable, largeTable } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { type RunningService, startRunningService, temporaryFolder } from '../support/running-service.ts';
import { smallDisk } from '../support/small-disk.ts';

const folders: string[] = [];
const folder = (): string => {
  folders.push(temporaryFolder());
  return folders[folders.length - 1];
};
const running: RunningService[] = [];
async function start(environment: Record<string, string>): Promise<RunningService> {
  const service = await startRunningService({ WORKERS: '1', ...environment });
  running.push(service);
  return service;
}
afterAll(async () => {
  await Promise.all(running.map((service) => service.stop()));
  for (const each of folders) fs.rmSync(each, { recursive: true, force: true });
});

const filesIn = (dataDir: string, ending: string): string[] =>
  fs
    .readdirSync(dataDir, { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith(ending))
    .map((name) => path.join(dataDir, name));
const idOf = async (response: Response): Promise<string> => ((await response.json()) as { id: string }).id;
const uploadedIds = async (service: RunningService): Promise<string[]> => {
  const { crystals } = (await (await service.get('/v1/crystals')).json()) as {
    crystals: { id: string; builtIn: boolean }[];
  };
  return crystals.filter(({ builtIn }) => !builtIn).map(({ id }) => id);
};

describe('tables on disk', () => {
  test('POST /v1/crystals: a second start finds the table and computes the same', async () => {
    const dataDir = folder();
    const first = await start({ DATA_DIR: dataDir });
    const id = await idOf(await first.post('/v1/crystals', inventedTable()));
    const scenario = inventedScenario({ crystal: { id } });
    const answer = await (await first.post('/v1/rates', scenario)).text();
    const values = await (await first.get(`/v1/crystals/${id}/values`)).text();
    first.kill('SIGTERM');
    await first.exited;
    const second = await start({ DATA_DIR: dataDir });
    expect(await uploadedIds(second)).toEqual([id]);
    expect(await (await second.post('/v1/rates', scenario)).text()).toBe(answer);
    expect(await (await second.get(`/v1/crystals/${id}/values`)).text()).toBe(values);
    expect((await second.post('/v1/crystals', inventedTable())).status).toBe(200);
    expect((await fetch(`${second.url}/v1/crystals/${id}`, { method: 'DELETE' })).status).toBe(204);
    expect(filesIn(dataDir, '.table')).toEqual([]);
  });

  test('POST /v1/crystals: kill −9 at any moment leaves whole tables only', async () => {
    const dataDir = folder();
    const rounds = 12;
    let [sent, acknowledged] = [0, new Set<string>()];
    for (let round = 0; round < rounds; round++) {
      const service = await start({ DATA_DIR: dataDir });
      const uploads = Array.from({ length: 6 }, () =>
        service.post('/v1/crystals', largeTable(400, 250, `Invented numbers ${sent++}`)).then(
          async (response) => void acknowledged.add(await idOf(response)),
          () => undefined,
        ),
      );
      // after none, one, two, … of the six are stored, and a moment into the next: on a slow machine as on a fast one
      const before = acknowledged.size;
      const enough = async (): Promise<void> => {
        while (acknowledged.size - before < round % 6) await new Promise((resolve) => setTimeout(resolve, 2));
        await new Promise((resolve) => setTimeout(resolve, 5 * round));
      };
      await Promise.race([Promise.all(uploads), enough()]);
      service.kill('SIGKILL');
      await Promise.all([service.exited, ...uploads]);
    }
    const files = filesIn(dataDir, '.table');
    for (const file of files) {
      expect(createHash('sha256').update(fs.readFileSync(file)).digest('hex')).toBe(path.basename(file, '.table'));
    }
    // a leftover of a write cut short is no table
    fs.mkdirSync(path.join(dataDir, 'crystals'), { recursive: true });
    fs.writeFileSync(path.join(dataDir, 'crystals', `${'0'.repeat(64)}-1-1.part`), 'half');
    const service = await start({ DATA_DIR: dataDir });
    const ids = await uploadedIds(service);
    expect(ids.sort()).toEqual(files.map((file) => path.basename(file, '.table')).sort());
    expect(acknowledged.size).toBeGreaterThan(0);
    expect(acknowledged.size).toBeLessThan(sent);
    for (const id of acknowledged) expect(ids).toContain(id);
    for (const id of ids)
      expect((await service.post('/v1/rates', inventedScenario({ crystal: { id } }))).status).toBe(200);
  }, 180_000);

  test.each<[string, (file: string) => void]>([
    [
      'a flipped bit',
      (file) => {
        const content = fs.readFileSync(file);
        content[content.length - 3] ^= 1;
        fs.writeFileSync(file, content);
      },
    ],
    ['a truncated file', (file) => fs.truncateSync(file, fs.statSync(file).size - 8)],
    ['an empty file', (file) => fs.writeFileSync(file, '')],
    ['another table under its name', (file) => fs.writeFileSync(file, `{"name":"x"}\n${'\0'.repeat(64)}`)],
  ])(
    'POST /v1/rates: %s is reported and not used, everything else goes on, an upload repairs it',
    async (_what, damage) => {
      const dataDir = folder();
      const first = await start({ DATA_DIR: dataDir });
      const id = await idOf(await first.post('/v1/crystals', inventedTable()));
      const scenario = inventedScenario({ crystal: { id } });
      const answer = await (await first.post('/v1/rates', scenario)).text();
      await first.stop();
      damage(filesIn(dataDir, '.table')[0]);
      const service = await start({ DATA_DIR: dataDir });
      for (const response of [
        await service.post('/v1/rates', scenario),
        await service.get(`/v1/crystals/${id}`),
        await service.get(`/v1/crystals/${id}/values`),
      ]) {
        const { detail } = await problemOf(response, 'internal');
        expect(detail).toContain(id);
        expect(detail).toContain('damaged');
      }
      expect(service.stderr()).toContain(id);
      expect((await service.get('/v1/crystals')).status).toBe(200);
      expect((await service.post('/v1/rates', inventedScenario({ crystal: { id: 'silicon' } }))).status).toBe(200);
      expect((await service.post('/v1/crystals', inventedTable())).status).toBe(201);
      expect(await (await service.post('/v1/rates', scenario)).text()).toBe(answer);
    },
  );
});

describe('a disk that refuses', () => {
  async function refusesUploads(service: RunningService, table: unknown): Promise<void> {
    const { detail } = await problemOf(await service.post('/v1/crystals', table), 'storage-full');
    expect(detail).not.toContain(service.dataDir);
    expect((await service.post('/v1/rates', inventedScenario({ crystal: { id: 'silicon' } }))).status).toBe(200);
    expect((await service.post('/v1/rates', inventedScenario())).status).toBe(200);
    await problemOf(await service.get(`/v1/crystals/${'0'.repeat(64)}`), 'not-found');
    expect(await uploadedIds(service)).toEqual([]);
    expect((await service.get('/readyz')).status).toBe(200);
  }

  test('POST /v1/crystals: 507 where DATA_DIR cannot be a folder, while rates go on', async () => {
    const file = path.join(folder(), 'file');
    fs.writeFileSync(file, '');
    await refusesUploads(await start({ DATA_DIR: path.join(file, 'below') }), inventedTable());
  });

  const mounted = smallDisk(folder(), '256k');
  afterAll(() => {
    if (mounted) execFileSync('umount', ['-l', mounted]);
  });

  test.skipIf(!mounted)(
    'POST /v1/crystals: 507 on a full disk, nothing left behind, and room again after',
    async () => {
      const service = await start({ DATA_DIR: mounted! });
      await refusesUploads(service, largeTable(400, 250));
      expect([...filesIn(mounted!, '.table'), ...filesIn(mounted!, '.part')]).toEqual([]);
      expect((await service.post('/v1/crystals', inventedTable())).status).toBe(201);
    },
  );
});
