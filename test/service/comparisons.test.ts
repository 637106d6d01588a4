import { describe, expect, it } from 'vitest';
import type { ComparisonAnswer } from '../../service/schemas/comparisons.ts';
import type { Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';
import { xmlTree } from '../support/xml-tree.ts';

const app = testApp();
const side = (over: Json = {}, scenario: Json = {}): Json => ({
  scenario: {
    darkMatter: { mediator: 'heavy' },
    crystal: { id: 'silicon' },
    goal: { kind: 'events', count: 3, window: { from: 2, to: 8 } },
    ...scenario,
  },
  exposure: '1 kg yr',
  masses: { from: '2 MeV', to: '200 MeV', count: 5 },
  ...over,
});

async function compare(body: Json): Promise<ComparisonAnswer> {
  const response = await app.post('/v1/comparisons', body);
  const text = await response.text();
  expect(response.status, text.slice(0, 500)).toBe(200);
  return JSON.parse(text) as ComparisonAnswer;
}

describe('POST /v1/comparisons', () => {
  it('equal sides are the same, ratio 1 everywhere, no difference', async () => {
    const answer = await compare({ baseline: side(), candidate: side() });
    expect(answer).toMatchObject({
      verdict: 'same',
      differences: [],
      largest: { gain: null, loss: null },
      onlyBaseline: [],
      onlyCandidate: [],
    });
    for (const { ratio } of answer.points) expect(ratio).toBe(1);
  });

  it('half the exposure is worse by 2 at every mass, the other way round better, and the patch says why', async () => {
    const half = side({ exposure: '500 g yr' });
    const worse = await compare({ baseline: side(), candidate: half });
    expect(worse.verdict).toBe('worse');
    for (const { ratio } of worse.points) expect(ratio).toBeCloseTo(2, 9);
    expect(worse.differences).toEqual([{ op: 'replace', path: '/exposureKgYr', value: 0.5 }]);
    expect((await compare({ baseline: half, candidate: side() })).verdict).toBe('better');
    expect((await compare({ baseline: side(), candidate: half, tolerance: 1.01 })).verdict).toBe('same');
  });

  it('a finished answer stands for its request, whichever side', async () => {
    const other = side({}, { darkMatter: { mediator: 'light' } });
    const finished = (await (await app.post('/v1/reach', side())).json()) as Json;
    const direct = await compare({ baseline: side(), candidate: other });
    expect(await compare({ baseline: finished, candidate: other })).toEqual(direct);
    expect(direct.differences).toEqual([{ op: 'replace', path: '/scenario/darkMatter/mediator/kind', value: 'light' }]);
  });

  it('other grids are interpolated and said so; masses only one side has are listed', async () => {
    const finer = side({ masses: { from: '1 MeV', to: '100 MeV', count: 9 } });
    const answer = await compare({ baseline: side(), candidate: finer, tolerance: 0.5 });
    expect(answer.points.some(({ interpolated }) => interpolated === 'baseline')).toBe(true);
    expect(answer.points.some(({ interpolated }) => interpolated === 'candidate')).toBe(true);
    expect(answer.onlyBaseline.map(({ mass }) => mass.value)).toContain(200);
    expect(answer.notices.map(({ code }) => code)).toContain('interpolated');
    const disjoint = await compare({
      baseline: side(),
      candidate: side({ masses: { unit: 'MeV', values: [500, 900] } }),
    });
    expect(disjoint).toMatchObject({ verdict: 'mixed', points: [] });
    expect(disjoint.notices.map(({ code }) => code)).toContain('nothing-in-common');
  });

  it('Markdown and CSV by Accept', async () => {
    const body = { baseline: side(), candidate: side({ exposure: '500 g yr' }) };
    const markdown = await app.post('/v1/comparisons', body, { accept: 'text/markdown' });
    expect(markdown.headers.get('content-type')).toBe('text/markdown; charset=utf-8');
    expect(await markdown.text()).toContain('**worse**');
    const csv = await (await app.post('/v1/comparisons', body, { accept: 'text/csv' })).text();
    expect(csv.trimEnd().split(/\r?\n/)).toHaveLength(6);
  });

  it('a figure of both curves by Accept', async () => {
    const body = { baseline: side(), candidate: side({ exposure: '500 g yr' }) };
    const response = await app.post('/v1/comparisons', body, { accept: 'image/svg+xml' });
    expect(response.headers.get('content-type')).toBe('image/svg+xml');
    const text = await response.text();
    expect(xmlTree(text).name).toBe('svg');
    for (const name of ['baseline', 'candidate', 'planning estimate']) expect(text).toContain(name);
  });

  it('every fault at once, on both sides', async () => {
    const body = {
      baseline: side({ exposure: 3 }),
      candidate: side({}, { crystal: { id: 'nowhere' }, goal: undefined }),
      tolerance: -1,
    };
    const pointers = await pointersOf(await app.post('/v1/comparisons', body));
    expect([...pointers].sort()).toEqual([
      '/baseline/exposure',
      '/candidate/scenario/crystal/id',
      '/candidate/scenario/goal',
      '/tolerance',
    ]);
    const points = [{ mass: { value: -1, unit: 'MeV' }, crossSection: null }];
    expect(await pointersOf(await app.post('/v1/comparisons', { baseline: { points }, candidate: side() }))).toEqual([
      '/baseline/points/0/mass/value',
    ]);
  });
});
