/** The night in this process: its own clock, an application without port or threads, a history that is thrown away. */
import fs from 'node:fs';
import path from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import type { ReachService } from '../../service/nightly/ask-reach.ts';
import { HistoryError, readReference } from '../../service/nightly/history.ts';
import { planOf } from '../../service/nightly/plan.ts';
import { type Progress, progressOn } from '../../service/nightly/progress.ts';
import { type NightJob, type NightResult, runNight } from '../../service/nightly/run-night.ts';
import { changedAt, inventedTable, type Json } from '../support/invented.ts';
import { temporaryFolder } from '../support/running-service.ts';
import { testApp } from '../support/test-app.ts';
import { everyElement, textOf, xmlTree } from '../support/xml-tree.ts';

const folders: string[] = [];
const newFolder = (): string => {
  folders.push(temporaryFolder());
  return path.join(folders[folders.length - 1], 'nightly');
};
afterAll(() => {
  for (const folder of folders) fs.rmSync(folder, { recursive: true, force: true });
});

const reach = (over: Json = {}): Json => ({
  scenario: {
    darkMatter: { mediator: 'heavy' },
    crystal: inventedTable(),
    goal: { kind: 'events', count: 3 },
  },
  exposure: '1 kg yr',
  masses: { from: '5 MeV', to: '50 MeV', count: 3 },
  ...over,
});
const reachWith = (pointer: string, value: unknown): Json => changedAt(reach(), pointer, value);

const service = (app = testApp()): ReachService => ({
  name: 'a test',
  request: (at, { method = 'GET', body, headers }) =>
    app.call(method, at, body as string | undefined, headers as Record<string, string>),
});
const silent: Progress = { curve() {}, points() {}, curveDone() {}, end() {} };

let nights = 0;
async function night(
  folder: string,
  curves: Record<string, Json>,
  over: Partial<NightJob> = {},
): Promise<NightResult & { text: string }> {
  const list = Object.entries(curves).map(([name, asked]) => ({ name, reach: asked }));
  const result = await runNight({
    plan: planOf(JSON.stringify({ curves: list })),
    service: service(),
    folder,
    startedAt: new Date('2027-01-02T03:04:05Z'),
    suffix: (++nights).toString(16).padStart(8, '0'),
    accept: false,
    progress: silent,
    signal: new AbortController().signal,
    ...over,
  });
  return { ...result, text: result.lines.join('\n') };
}

const accepted = async (asked: Json, over: Partial<NightJob> = {}): Promise<string> => {
  const folder = newFolder();
  expect((await night(folder, { curve: asked }, { accept: true, ...over })).exitCode).toBe(0);
  return folder;
};
const jsonIn = (folder: string, name: string) => JSON.parse(fs.readFileSync(path.join(folder, name), 'utf8')) as Json;
const curveIn = (folder: string): Json => (jsonIn(folder, 'summary.json')['curves'] as Json[])[0];
const inputsIn = (folder: string): string[] =>
  (curveIn(folder)['inputs'] as { input: string }[]).map(({ input }) => input);

describe('runNight', () => {
  test('runNight: the first night says that there is no reference, and how to make one', async () => {
    const folder = newFolder();
    const { exitCode, text } = await night(folder, { curve: reach() });
    expect(exitCode).toBe(0);
    expect(text).toContain('no reference yet; --accept makes tonight the reference');
    expect(readReference(folder)).toBeUndefined();
  });

  test('runNight: an unchanged plan does not move', async () => {
    const folder = await accepted(reach());
    const { exitCode, text, folder: run } = await night(folder, { curve: reach() });
    expect(exitCode).toBe(0);
    expect(text).toContain('Nothing moved.');
    expect(curveIn(run)).toMatchObject({ state: 'same', verdict: 'same', inputs: [], differences: [] });
  });

  test('runNight: its files are the answer of the service, CSV, Markdown and a figure with the reference behind', async () => {
    const folder = await accepted(reach());
    const { folder: run } = await night(folder, { curve: reach() });
    expect(fs.readdirSync(run).sort()).toEqual(
      ['comparison.csv', 'csv', 'json', 'md', 'svg']
        .map((ending) => `curve.${ending}`)
        .concat('plan.json', 'summary.json', 'summary.md'),
    );
    const answer = await (await testApp().post('/v1/reach', reach())).json();
    expect(jsonIn(run, 'curve.json')).toEqual(answer);
    const csv = await (await testApp().post('/v1/reach', reach(), { accept: 'text/csv' })).text();
    expect(fs.readFileSync(path.join(run, 'curve.csv'), 'utf8')).toBe(csv);
    const svg = xmlTree(fs.readFileSync(path.join(run, 'curve.svg'), 'utf8'));
    expect(textOf(svg)).toContain('Reference: reference.');
    expect(everyElement(svg).filter(({ name }) => name === 'path').length).toBeGreaterThanOrEqual(2);
    const comparison = await testApp().post(
      '/v1/comparisons',
      { baseline: answer, candidate: jsonIn(run, 'curve.json') },
      { accept: 'text/csv' },
    );
    expect(fs.readFileSync(path.join(run, 'curve.comparison.csv'), 'utf8')).toBe(await comparison.text());
  });

  const halo = reachWith('/scenario/halo', { circularSpeed: '200 km/s' });
  test.each<[string, Json, string[], string]>([
    ['halo', halo, ['halo'], 'halo: circularSpeedKmPerS 238 → 200'],
    ['exposure', reach({ exposure: '2 kg yr' }), ['exposure'], 'exposure: exposureKgYr 1 → 2'],
    ['goal', reachWith('/scenario/goal/count', 6), ['goal'], 'goal: count 3 → 6'],
    [
      'mediator',
      reachWith('/scenario/darkMatter/mediator', 'light'),
      ['mediator'],
      'mediator: mediator.kind heavy → light',
    ],
    [
      'splitting',
      reachWith('/scenario/darkMatter/massSplitting', '0.5 eV'),
      ['mass splitting'],
      'massSplittingEv 0 → 0.5',
    ],
    [
      'ionization',
      reachWith('/scenario/ionization', { maxElectrons: 1 }),
      ['detector', 'goal'],
      'ionization.maxElectrons 15 → 1',
    ],
    [
      'readout',
      reachWith('/scenario/readout', { efficiency: Array(16).fill(0.5) }),
      ['detector'],
      'detector: readout none → ',
    ],
    ['halo and exposure', { ...halo, exposure: '2 kg yr' }, ['halo', 'exposure'], 'exposure: exposureKgYr 1 → 2'],
  ])('runNight: a changed %s moves the curve and is named', async (_what, asked, inputs, words) => {
    const { exitCode, text, folder } = await night(await accepted(reach()), { curve: asked });
    expect(exitCode).toBe(1);
    expect(inputsIn(folder)).toEqual(inputs);
    expect(text).toContain('moved beyond 5 %');
    expect(text).toContain(words);
    expect(text).toContain('the plan asks for something else');
    expect(curveIn(folder)['differences']).not.toEqual([]);
    expect(fs.readFileSync(path.join(folder, 'curve.md'), 'utf8')).toContain('## As a JSON Patch');
  });

  test('runNight: another table under the same name is named, and that the plan is the same', async () => {
    // two stores, one alias: what a release that replaces a built-in table looks like to the plan
    const upload = async (values: Json): Promise<ReachService> => {
      const app = testApp();
      const { id } = (await (await app.post('/v1/crystals', inventedTable(values))).json()) as { id: string };
      return {
        name: 'a test',
        request: (at, { method = 'GET', body, headers }) =>
          app.call(method, at, String(body).replace('"alias"', `"${id}"`), headers as Record<string, string>),
      };
    };
    const asked = reachWith('/scenario/crystal', { id: 'alias' });
    const folder = await accepted(asked, { service: await upload({}) });
    const other = {
      bandGap: '1.2 eV',
      formFactorSquared: [
        [0.2, 0.4, 0.2],
        [0, 0.6, 0.4],
      ],
    };
    const { exitCode, text, folder: run } = await night(folder, { curve: asked }, { service: await upload(other) });
    expect(exitCode).toBe(1);
    // the gap came with the table: no detector changed
    expect(inputsIn(run)).toEqual(['table']);
    expect(text).toMatch(/table: alias id [0-9a-f]{64} → [0-9a-f]{64}; ionization\.bandGapEv 1\.12 → 1\.2/);
    expect(text).toContain('the plan is the same; the service changed under it');
  });

  test('runNight: a changed service version and other constants are named', async () => {
    const folder = await accepted(reach());
    const [run] = fs.readdirSync(folder).filter((name) => name.startsWith('2027'));
    const file = path.join(folder, run, 'curve.json');
    fs.writeFileSync(file, fs.readFileSync(file, 'utf8').replace('"codata":2022', '"codata":2018'));
    const other = service(testApp({ version: '9.9.9' }));
    const { exitCode, text } = await night(folder, { curve: reach() }, { service: other });
    expect(exitCode).toBe(0);
    expect(text).toContain('service version 1.2.3 → 9.9.9');
    expect(text).toContain('CODATA 2018 → 2022');
  });

  test('runNight: numbers that move by themselves are told as such', async () => {
    const folder = await accepted(reach());
    const [run] = fs.readdirSync(folder).filter((name) => name.startsWith('2027'));
    const file = path.join(folder, run, 'curve.json');
    const answer = jsonIn(path.dirname(file), 'curve.json') as { points: { crossSection: { value: number } }[] };
    answer.points[1].crossSection.value *= 2;
    fs.writeFileSync(file, JSON.stringify(answer));
    const { exitCode, text } = await night(folder, { curve: reach() });
    expect(exitCode).toBe(1);
    expect(text).toContain('nothing in the inputs: the numbers alone moved');
  });

  test('runNight: within the tolerance nothing moved, and what changed is told all the same', async () => {
    const asked = reach({ exposure: '1.01 kg yr' });
    const { exitCode, text } = await night(await accepted(reach()), { curve: asked });
    expect(exitCode).toBe(0);
    expect(text).toContain('exposure: exposureKgYr 1 → 1.01');
  });

  test('runNight: the band of several tables moves with any of them', async () => {
    const crystal = (scale: number): Json[] => [
      inventedTable(),
      inventedTable({
        formFactorSquared: [
          [scale, 0.2, 0.1],
          [0, 0.3, 0.2],
        ],
      }),
    ];
    const folder = await accepted(reachWith('/scenario/crystal', crystal(0.2)));
    const { exitCode, text, folder: run } = await night(folder, { curve: reachWith('/scenario/crystal', crystal(2)) });
    expect(exitCode).toBe(1);
    expect(curveIn(run)).toMatchObject({ verdict: 'same', movedEdges: ['lowest'] });
    expect(text).toContain('table: inline id');
  });

  test('runNight: a curve that fails ends with 2, the others are written, and nothing is accepted', async () => {
    const folder = await accepted(reach());
    const before = readReference(folder)!.run;
    const bad = reachWith('/scenario/crystal', { id: 'unobtainium' });
    const { exitCode, text, folder: run } = await night(folder, { curve: reach(), bad }, { accept: true });
    expect(exitCode).toBe(2);
    expect(text).toContain('/curves/1/reach/scenario/crystal/id: no table has the id or alias "unobtainium"');
    expect(text).toContain('Not accepted');
    expect(fs.existsSync(path.join(run, 'curve.svg'))).toBe(true);
    expect(readReference(folder)!.run).toBe(before);
  });

  test('runNight: --accept makes tonight the reference of the next night', async () => {
    const folder = await accepted(reach());
    const moved = await night(folder, { curve: halo }, { accept: true });
    expect(moved.exitCode).toBe(1);
    expect(readReference(folder)!.run).toBe(moved.run);
    expect((await night(folder, { curve: halo })).exitCode).toBe(0);
  });

  test('runNight: curves that are new or gone are named and do not move', async () => {
    const folder = await accepted(reach());
    const { exitCode, text } = await night(folder, { renamed: reach() });
    expect(exitCode).toBe(0);
    expect(text).toContain('renamed: no reference yet');
    expect(text).toContain('no longer in the plan: curve');
  });

  test('runNight: names of other alphabets, of Markdown and of HTML are written as they are', async () => {
    const name = '<b>シリコン</b> | *2* & "x"';
    const folder = newFolder();
    await night(folder, { [name]: reach() }, { accept: true });
    const { folder: run } = await night(folder, { [name]: halo });
    const svg = fs.readdirSync(run).find((file) => file.endsWith('.svg'))!;
    expect(textOf(xmlTree(fs.readFileSync(path.join(run, svg), 'utf8')))).toContain(name);
    expect(fs.readFileSync(path.join(run, 'summary.md'), 'utf8')).toContain('&lt;b&gt;シリコン&lt;/b&gt; \\| \\*2\\*');
  });

  test('runNight: a signal leaves the history as it was', async () => {
    const folder = await accepted(reach());
    const before = fs.readdirSync(folder);
    const stop = new AbortController();
    const progress = { ...silent, points: () => stop.abort(new Error('stopped')) };
    await expect(night(folder, { curve: reach() }, { signal: stop.signal, progress })).rejects.toThrow('stopped');
    expect(fs.readdirSync(folder)).toEqual(before);
  });

  test('runNight: runs of the same second do not meet, and one name is never used twice', async () => {
    // this second's: files of another time than the clock's would be taken for leftovers
    const at = { accept: true, startedAt: new Date() };
    const folder = await accepted(reach(), at);
    await Promise.all(Array.from({ length: 4 }, () => night(folder, { curve: reach() }, at)));
    const runs = fs.readdirSync(folder).filter((name) => name !== 'reference.json');
    expect(runs).toHaveLength(5);
    expect(runs).toContain(readReference(folder)!.run);
    await expect(night(folder, { curve: reach() }, { ...at, suffix: runs[0].slice(-8) })).rejects.toThrow(HistoryError);
    expect(fs.readdirSync(folder).filter((name) => name.startsWith('.'))).toEqual([]);
  });

  test('runNight: what dead runs left is swept once it is old, and never before', async () => {
    const folder = await accepted(reach());
    const left = ['.20260101T000000Z-0000aaaa.part', '.20260101T000000Z-0000bbbb.part'];
    for (const name of left) fs.mkdirSync(path.join(folder, name));
    const startedAt = new Date('2027-01-02T03:04:05Z');
    const hoursBefore = (hours: number): Date => new Date(startedAt.getTime() - hours * 3_600_000);
    fs.utimesSync(path.join(folder, left[0]), hoursBefore(49), hoursBefore(49));
    fs.utimesSync(path.join(folder, left[1]), hoursBefore(47), hoursBefore(47));
    await night(folder, { curve: reach() }, { startedAt });
    expect(fs.readdirSync(folder).filter((name) => name.startsWith('.'))).toEqual([left[1]]);
  });

  test.each([
    ['is no JSON', '{"run'],
    ['names no run', '{"run":"../../somewhere"}'],
    ['names a run that is gone', '{"run":"20200101T000000Z-00000000"}'],
  ])('runNight: a reference that %s ends the night, unless tonight is to replace it', async (_what, content) => {
    const folder = await accepted(reach());
    const runs = fs.readdirSync(folder);
    fs.writeFileSync(path.join(folder, 'reference.json'), content);
    await expect(night(folder, { curve: reach() })).rejects.toThrow(/reference cannot be read.*--accept/);
    expect(fs.readdirSync(folder)).toEqual(runs);
    const replaced = await night(folder, { curve: reach() }, { accept: true });
    expect(replaced.exitCode).toBe(0);
    expect(readReference(folder)!.run).toBe(replaced.run);
  });
});

describe('askReach', () => {
  const answering = (...responses: (() => Response)[]): ReachService & { asked: string[] } => {
    const asked: string[] = [];
    return {
      name: 'http://service',
      asked,
      request: async (_at, { headers }) => {
        asked.push((headers as Record<string, string>)['accept']);
        return responses[Math.min(asked.length, responses.length) - 1]();
      },
    };
  };
  const problem =
    (status: number, body: object, headers = {}) =>
    () =>
      new Response(JSON.stringify(body), { status, headers });
  const failed = async (from: ReachService): Promise<string> => {
    const { exitCode, text } = await night(newFolder(), { curve: reach() }, { service: from });
    expect(exitCode).toBe(2);
    return text;
  };

  test('askReach: a busy service is asked again when it says, and not for ever', async () => {
    const busy = problem(503, { detail: 'Too many computations are waiting.' }, { 'retry-after': '0' });
    const from = answering(busy);
    expect(await failed(from)).toContain('Too many computations are waiting. (status 503)');
    expect(from.asked).toHaveLength(4);
  });

  test('askReach: a stream that breaks off is asked for as a whole, whose problem says why', async () => {
    const cut = () => new Response('{"mass":{"value":5,"unit":"MeV"},"crossSection":null}\n{"mass":');
    const from = answering(cut, problem(422, { detail: 'It took too long.' }));
    expect(await failed(from)).toContain('It took too long.');
    expect(from.asked).toEqual(['application/x-ndjson', 'application/json']);
  });

  test.each<[string, () => Response, string]>([
    ['no problem of ours', () => new Response('<html>', { status: 502 }), 'status 502'],
    ['no JSON', () => new Response('<html>'), 'no answer that can be read'],
    ['no reach', () => new Response('{"provenance":{}}\n'), 'no reach'],
    ['control characters', problem(422, { detail: 'x\u001b[2Jy' }), 'x [2Jy'],
  ])('askReach: %s is told plainly', async (_what, response, told) => {
    expect(await failed(answering(response))).toContain(told);
  });
});

describe('progressOn', () => {
  const shown = (isTTY: boolean, quiet = false): string => {
    let text = '';
    const write = (piece: string): void => {
      text += piece;
    };
    const stream = { isTTY, columns: 40, write };
    const progress = progressOn(stream, 2, quiet);
    progress.curve('silicon', 8);
    for (let point = 1; point <= 8; point++) progress.points(point);
    progress.curveDone('nothing moved');
    progress.end();
    return text;
  };

  test('progressOn: plain lines in a log, a quarter at a time', () => {
    expect(shown(false).split('\n')).toEqual([
      '1/2 silicon: 8 masses',
      '1/2 silicon: 2 of 8 masses',
      '1/2 silicon: 4 of 8 masses',
      '1/2 silicon: 6 of 8 masses',
      '1/2 silicon: nothing moved',
      '',
    ]);
  });

  test('progressOn: a bar on a terminal, never longer than its line, and taken away at the end', () => {
    const text = shown(true);
    expect(text).toContain(`[${'█'.repeat(12)}${'·'.repeat(12)}] 4/8`);
    for (const line of text.split('\r\u001b[2K')) expect([...line.split('\n')[0]].length).toBeLessThan(40);
    expect(text.endsWith('\r\u001b[2K')).toBe(true);
  });

  test('progressOn: nothing where it is to be quiet', () => {
    expect(shown(true, true) + shown(false, true)).toBe('');
  });
});
