/** The built nightly job as a process: its exit codes, and a history that stays whole whatever happens to it. */
import { execFileSync, spawn } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { changedAt, inventedTable, type Json } from '../support/invented.ts';
import { type Exit, type RunningService, startRunningService, temporaryFolder } from '../support/running-service.ts';
import { smallDisk } from '../support/small-disk.ts';
import { xmlTree } from '../support/xml-tree.ts';

const NIGHTLY = fileURLToPath(new URL('../../dist/service/nightly.js', import.meta.url));
const SAMPLE = fileURLToPath(new URL('../../service/nightly/sample-plan.json', import.meta.url));

const folders: string[] = [];
const newFolder = (): string => {
  folders.push(temporaryFolder());
  return folders[folders.length - 1];
};

const reach: Json = {
  scenario: { darkMatter: { mediator: 'heavy' }, crystal: inventedTable(), goal: { kind: 'events', count: 3 } },
  exposure: '1 kg yr',
  masses: { from: '5 MeV', to: '50 MeV', count: 3 },
};
const planFile = (plan: unknown): string => {
  const file = path.join(newFolder(), 'plan.json');
  fs.writeFileSync(file, typeof plan === 'string' ? plan : JSON.stringify(plan));
  return file;
};
const planOf = (asked: Json, curves = 1): string =>
  planFile({ curves: Array.from({ length: curves }, (_, i) => ({ name: `curve-${i}`, reach: asked })) });

function launch(words: readonly string[], environment: Record<string, string> = {}) {
  const child = spawn(process.execPath, [NIGHTLY, ...words], {
    env: { PATH: process.env['PATH'] ?? '', WORKERS: '1', ...environment },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  const text = { stdout: '', stderr: '' };
  for (const name of ['stdout', 'stderr'] as const) {
    child[name].setEncoding('utf8').on('data', (piece: string) => {
      text[name] += piece;
    });
  }
  const exited = new Promise<Exit>((resolve) => {
    child.on('close', (code, signal) => resolve({ code, signal }));
  });
  return { text, exited, kill: (signal: NodeJS.Signals) => void child.kill(signal) };
}

async function run(words: readonly string[], environment: Record<string, string> = {}) {
  const { text, exited } = launch(words, environment);
  return { ...(await exited), ...text };
}

const runsIn = (dataDir: string): string[] => {
  const folder = path.join(dataDir, 'nightly');
  if (!fs.existsSync(folder)) return [];
  return fs.readdirSync(folder).filter((name) => !name.startsWith('.') && name !== 'reference.json');
};

/** Every run is there with all its files, and the reference names one of them; returns how many there are. */
function requireWhole(dataDir: string): number {
  const folder = path.join(dataDir, 'nightly');
  const json = (...names: string[]): Json => JSON.parse(fs.readFileSync(path.join(folder, ...names), 'utf8')) as Json;
  const runs = runsIn(dataDir);
  for (const name of runs) {
    const { curves } = json(name, 'summary.json') as { curves: { files?: Record<string, string> }[] };
    const { curves: planned } = json(name, 'plan.json') as { curves: unknown[] };
    expect(curves).toHaveLength(planned.length);
    const files = curves.flatMap((curve) => Object.values(curve.files ?? {}));
    expect(fs.readdirSync(path.join(folder, name)).sort()).toEqual(
      [...files, 'plan.json', 'summary.json', 'summary.md'].sort(),
    );
    for (const file of files) {
      const text = fs.readFileSync(path.join(folder, name, file), 'utf8');
      expect(text.endsWith('\n'), file).toBe(true);
      if (file.endsWith('.json')) expect(JSON.parse(text)).toHaveProperty('provenance');
      if (file.endsWith('.svg')) xmlTree(text);
    }
  }
  expect(runs).toContain(json('reference.json')['run']);
  return runs.length;
}

/** A disk of 256 KiB, where there is the right to mount one. */
const mounted = smallDisk(newFolder(), '256k');

let service: RunningService;
beforeAll(async () => {
  service = await startRunningService({ WORKERS: '1' });
});
afterAll(async () => {
  await service.stop();
  if (mounted) execFileSync('umount', ['-l', mounted]);
  for (const each of folders) fs.rmSync(each, { recursive: true, force: true });
});

describe('nightly', () => {
  test('nightly.js: in this process, unchanged ends with 0 and a changed halo with 1, with the right words', async () => {
    const data = newFolder();
    const first = await run([planOf(reach), '--data', data, '--accept']);
    expect([first.code, first.stdout]).toEqual([0, expect.stringContaining('no reference yet')]);
    expect(first.stdout).toContain('Accepted');
    const same = await run([planOf(reach)], { DATA_DIR: data });
    expect([same.code, same.stdout]).toEqual([0, expect.stringContaining('Nothing moved.')]);
    expect(same.stderr).toContain('1/1 curve-0: 3 masses\n');
    const halo = changedAt(reach, '/scenario/halo', { circularSpeed: '200 km/s' });
    const moved = await run([planOf(halo), '--data', data, '--quiet']);
    expect([moved.code, moved.stderr]).toEqual([1, '']);
    expect(moved.stdout).toContain('halo: circularSpeedKmPerS 238 → 200');
    expect(requireWhole(data)).toBe(3);
  });

  test('nightly.js: the sample plan runs, and does not move the next night', async () => {
    const words = [SAMPLE, '--data', newFolder()];
    expect((await run([...words, '--accept'])).code).toBe(0);
    expect(await run(words)).toMatchObject({ code: 0, stdout: expect.stringContaining('Nothing moved.') });
    expect(requireWhole(words[2])).toBe(2);
  });

  test('nightly.js: --url asks a running service, and finds what the job finds by itself', async () => {
    const data = newFolder();
    expect((await run([planOf(reach), '--data', data, '--accept'])).code).toBe(0);
    const asked = await run([planOf(reach), '--data', data, '--url', service.url]);
    expect([asked.code, asked.stdout]).toEqual([0, expect.stringContaining('Nothing moved.')]);
    const [one, other] = runsIn(data).map((name) =>
      fs.readFileSync(path.join(data, 'nightly', name, 'curve-0.json'), 'utf8'),
    );
    expect(one).toBe(other);
  });

  test('nightly.js: a service that cannot be reached is 2, told plainly, and nothing is written', async () => {
    const data = newFolder();
    const { code, stdout, stderr } = await run([planOf(reach), '--data', data, '--url', 'http://127.0.0.1:9']);
    expect([code, stdout]).toEqual([2, '']);
    expect(stderr).toMatch(/^The nightly job could not run: http:\/\/127\.0\.0\.1:9 cannot be reached: .*\n$/);
    expect(fs.readdirSync(data)).toEqual([]);
  });

  test('nightly.js: a problem of the service is shown with its pointer in the plan, the other curves are written', async () => {
    const data = newFolder();
    const unknown = changedAt(reach, '/scenario/crystal', { id: 'unobtainium' });
    const plan = planFile({
      curves: [
        { name: 'bad', reach: unknown },
        { name: 'good', reach },
      ],
    });
    const { code, stdout } = await run([plan, '--data', data, '--url', service.url, '--accept']);
    expect(code).toBe(2);
    expect(stdout).toContain('/curves/0/reach/scenario/crystal/id: no table has the id or alias "unobtainium"');
    const [name] = runsIn(data);
    expect(fs.existsSync(path.join(data, 'nightly', name, 'good.svg'))).toBe(true);
    expect(fs.existsSync(path.join(data, 'nightly', 'reference.json'))).toBe(false);
  });

  test('nightly.js: a service that dies in the middle is 2, and the history is whole', async () => {
    const data = newFolder();
    expect((await run([planOf(reach), '--data', data, '--accept', '--url', service.url])).code).toBe(0);
    const dying = await startRunningService({ WORKERS: '1' });
    const job = launch([
      planOf({ ...reach, masses: { from: '5 MeV', to: '50 MeV', count: 900 } }, 20),
      '--data',
      data,
      '--url',
      dying.url,
    ]);
    await expect.poll(() => job.text.stderr, { timeout: 30_000 }).toContain('masses');
    await dying.stop();
    expect((await job.exited).code).toBe(2);
    expect(job.text.stdout).toContain('cannot be reached');
    expect(requireWhole(data)).toBe(2);
  });

  test.each<[string, string[], string[]]>([
    ['no plan', [], ['usage:']],
    ['an unknown option', ['plan.json', '--nope'], ['--nope', 'usage:']],
    ['a plan that is not there', ['/nowhere/plan.json'], ['/nowhere/plan.json', 'ENOENT']],
    ['a plan that is no JSON', [planFile('{')], ['not JSON']],
    [
      'a plan with faults',
      [planFile({ tolerance: -1, curves: [{ name: '', reach: { ...reach, exposure: '1 kg' } }] })],
      ['/tolerance:', '/curves/0/name:', '/curves/0/reach/exposure:'],
    ],
  ])('nightly.js: %s is 2 with every fault, and nothing is written', async (_what, words, told) => {
    const data = newFolder();
    const { code, stdout, stderr } = await run([...words, '--data', data]);
    expect([code, stdout]).toEqual([2, '']);
    for (const part of told) expect(stderr).toContain(part);
    expect(stderr).not.toMatch(/\n\s+at /);
    expect(fs.readdirSync(data)).toEqual([]);
  });

  test('nightly.js: a bad configuration is 2, with every fault', async () => {
    const { code, stderr } = await run([planOf(reach)], { WORKERS: '0', QUEUE: 'long', DATA_DIR: newFolder() });
    expect(code).toBe(2);
    expect(stderr).toMatch(/WORKERS=0[\s\S]*QUEUE=long/);
  });
});

describe('history', () => {
  test('nightly.js: kill −9 at any moment leaves the history whole', async () => {
    const data = newFolder();
    const plan = planOf(changedAt(reach, '/masses', { unit: 'MeV', values: [10] }), 12);
    const words = [plan, '--data', data, '--url', service.url, '--accept'];
    expect((await run(words)).code).toBe(0);
    const isWriting = (): boolean =>
      fs.readdirSync(path.join(data, 'nightly')).some((name) => name.endsWith('.part') && !leftovers.has(name));
    const leftovers = new Set<string>();
    let killed = 0;
    for (let round = 0; round < 8; round++) {
      const job = launch(words);
      await expect.poll(isWriting, { timeout: 30_000, interval: 1 }).toBe(true);
      await new Promise((resolve) => setTimeout(resolve, 25 * round));
      job.kill('SIGKILL');
      if ((await job.exited).signal === 'SIGKILL') killed++;
      for (const name of fs.readdirSync(path.join(data, 'nightly'))) if (name.endsWith('.part')) leftovers.add(name);
      requireWhole(data);
    }
    expect(killed).toBeGreaterThan(0);
    expect(await run(words)).toMatchObject({ code: 0, stdout: expect.stringContaining('Nothing moved.') });
    // young leftovers may belong to a run that goes on: they stay, and are no history
    for (const name of leftovers) expect(fs.existsSync(path.join(data, 'nightly', name))).toBe(true);
  }, 180_000);

  test('nightly.js: several at once each have their run, and the reference is one of them', async () => {
    const data = newFolder();
    const words = [planOf(reach, 5), '--data', data, '--url', service.url, '--accept'];
    const codes = await Promise.all(Array.from({ length: 4 }, async () => (await run(words)).code));
    expect(codes).toEqual([0, 0, 0, 0]);
    expect(requireWhole(data)).toBe(4);
    expect(fs.readdirSync(path.join(data, 'nightly')).filter((name) => name.startsWith('.'))).toEqual([]);
  });

  test('nightly.js: SIGTERM and SIGINT in the middle are 2, and the history is as it was', async () => {
    const data = newFolder();
    expect((await run([planOf(reach), '--data', data, '--accept'])).code).toBe(0);
    const long = { ...reach, masses: { from: '5 MeV', to: '50 MeV', count: 1000 } };
    for (const signal of ['SIGTERM', 'SIGINT'] as const) {
      const job = launch([planOf(long, 50), '--data', data]);
      await expect.poll(() => job.text.stderr, { timeout: 30_000 }).toContain('1000 masses');
      job.kill(signal);
      expect(await job.exited).toEqual({ code: 2, signal: null });
      expect(job.text.stderr).toContain(`stopped by ${signal}; nothing was added to the history`);
      expect(job.text.stdout).toBe('');
      expect(requireWhole(data)).toBe(1);
      expect(fs.readdirSync(path.join(data, 'nightly')).filter((name) => name.startsWith('.'))).toEqual([]);
    }
  });

  test('nightly.js: a DATA_DIR that cannot be is 2, told plainly', async () => {
    const file = path.join(newFolder(), 'file');
    fs.writeFileSync(file, '');
    const { code, stdout, stderr } = await run([
      planOf(reach),
      '--data',
      path.join(file, 'below'),
      '--url',
      service.url,
    ]);
    expect([code, stdout]).toEqual([2, '']);
    expect(stderr).toContain('cannot be written: a file is in the way (ENOTDIR)');
    expect(stderr).not.toMatch(/\n\s+at /);
  });

  test.skipIf(!mounted)(
    'nightly.js: a full or read-only disk is 2, told plainly, and the history is as it was',
    async () => {
      const words = (curves: number): string[] => [planOf(reach, curves), '--data', mounted!, '--url', service.url];
      expect((await run([...words(1), '--accept'])).code).toBe(0);
      const full = await run([...words(40), '--accept']);
      expect([full.code, full.stdout]).toEqual([2, '']);
      expect(full.stderr).toContain('the disk is full (ENOSPC)');
      expect(fs.readdirSync(path.join(mounted!, 'nightly'))).toHaveLength(2);
      expect((await run(words(1))).code).toBe(0);
      execFileSync('mount', ['-o', 'remount,ro', mounted!]);
      const readOnly = await run(words(1));
      expect([readOnly.code, readOnly.stdout]).toEqual([2, '']);
      expect(readOnly.stderr).toContain('the disk is read-only (EROFS)');
      expect(requireWhole(mounted!)).toBe(2);
    },
  );
});
