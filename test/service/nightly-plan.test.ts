import fs from 'node:fs';
import { describe, expect, test } from 'vitest';
import { commandLineOf, UsageError } from '../../service/nightly/command-line.ts';
import { fileStem } from '../../service/nightly/file-stem.ts';
import { PlanError, planOf } from '../../service/nightly/plan.ts';
import { inventedTable, type Json } from '../support/invented.ts';

const reach: Json = {
  scenario: {
    darkMatter: { mediator: 'heavy' },
    crystal: inventedTable(),
    goal: { kind: 'events', count: 3 },
  },
  exposure: '1 kg yr',
  masses: { from: '5 MeV', to: '50 MeV', count: 3 },
};

const faultsIn = (plan: unknown): Record<string, string> => {
  try {
    planOf(typeof plan === 'string' ? plan : JSON.stringify(plan));
  } catch (error) {
    if (!(error instanceof PlanError)) throw error;
    const faults = error.faults.map(({ pointer, detail }) => [pointer, detail] as const);
    return faults.length === 0 ? { '': error.message } : Object.fromEntries(faults);
  }
  return {};
};

describe('planOf', () => {
  test('planOf: the sample plan is one, and each curve has its own tolerance or that of the plan', () => {
    const file = new URL('../../service/nightly/sample-plan.json', import.meta.url);
    const plan = planOf(fs.readFileSync(file, 'utf8'));
    expect(plan.curves.map(({ stem, tolerance, masses }) => [stem, tolerance, masses])).toEqual([
      ['silicon-heavy-mediator', 0.05, 31],
      ['silicon-light-mediator', 0.05, 31],
      ['silicon-with-and-without-screening-three-events-fea40a3f', 0.02, 10],
    ]);
  });

  test('planOf: the request goes out as it was written, the tolerance is 0.05 where none is given', () => {
    const plan = planOf(JSON.stringify({ curves: [{ name: 'one', reach }] }));
    expect(plan.curves).toEqual([{ name: 'one', stem: 'one', tolerance: 0.05, asked: reach, masses: 3 }]);
  });

  test('planOf: every fault at once, each with its pointer from the top of the plan', () => {
    const { exposure: _exposure, ...noExposure } = reach;
    const faults = faultsIn({
      tolerance: -1,
      curvs: [],
      curves: [
        { name: 'a', reach: noExposure },
        { name: 'a', reach: { ...reach, masses: { from: '5', to: '50 MeV', count: 1 } }, tolerence: 1 },
        { name: ' b', reach: { ...reach, scenario: { ...(reach['scenario'] as Json), hallo: {} } } },
        { name: 'c\u0007', reach },
      ],
    });
    expect(Object.keys(faults).sort()).toEqual([
      '/curves/0/reach/exposure',
      '/curves/1/name',
      '/curves/1/reach/masses/count',
      '/curves/1/reach/masses/from',
      '/curves/1/tolerence',
      '/curves/2/name',
      '/curves/2/reach/scenario/hallo',
      '/curves/3/name',
      '/curvs',
      '/tolerance',
    ]);
    expect(faults['/curves/1/name']).toBe('is the name of curve 0 already');
    expect(faults['/curvs']).toBe('is not a known field');
  });

  test.each<[string, unknown, string]>([
    ['no JSON', '{"curves": [', ''],
    ['no object', 'null', ''],
    ['a list', '[]', ''],
    ['no curves', {}, '/curves'],
    ['an empty list of curves', { curves: [] }, '/curves'],
    ['a curve that is null', { curves: [null] }, '/curves/0'],
    ['a name of blanks', { curves: [{ name: '  ', reach }] }, '/curves/0/name'],
    ['a half of a character', `{"curves":[{"name":"\\ud800","reach":${JSON.stringify(reach)}}]}`, '/curves/0/name'],
  ])('planOf: %s is refused', (_what, plan, pointer) => {
    expect(Object.keys(faultsIn(plan))).toEqual([pointer]);
  });
});

describe('fileStem', () => {
  test('fileStem: a name that is safe stays; others keep what is safe of them, and a hash of the whole', () => {
    expect(fileStem('silicon-heavy-2')).toBe('silicon-heavy-2');
    expect(fileStem('Silizium, schwerer Vermittler')).toMatch(/^silizium-schwerer-vermittler-[0-9a-f]{8}$/);
    expect(fileStem('../../etc/passwd')).toMatch(/^etc-passwd-[0-9a-f]{8}$/);
    expect(fileStem('シリコン')).toMatch(/^[a-z-]+[0-9a-f]{8}$/);
    for (const taken of ['summary', 'plan', 'nul']) expect(fileStem(taken)).not.toBe(taken);
  });

  test('fileStem: names that differ only in case, in blanks or beyond the cut have different files', () => {
    const long = 'x'.repeat(90);
    const names = ['a b', 'a-b', 'A b', 'a  b', 'a.b', `${long}1`, `${long}2`, '?', '!'];
    const stems = names.map(fileStem);
    expect(new Set(stems).size).toBe(names.length);
    for (const stem of stems) expect(stem).toMatch(/^[a-z0-9-]{1,69}$/);
  });
});

describe('commandLineOf', () => {
  test('commandLineOf: a plan and every option', () => {
    const line = commandLineOf(['--accept', 'p.json', '--url', 'http://x:1/base/', '--data', 'd', '--quiet']);
    expect(line).toEqual({ planFile: 'p.json', url: 'http://x:1/base', accept: true, dataDir: 'd', quiet: true });
    expect(commandLineOf(['--help'])).toBeUndefined();
  });

  test.each([
    [[], 'one plan file'],
    [['a', 'b'], 'got 2'],
    [['a', '--acept'], '--acept'],
    [['a', '--url', 'x:1'], '--url'],
    [['a', '--url', 'http://user:secret@x'], '--url'],
    [['a', '--data='], '--data'],
  ])('commandLineOf: %j is refused', (words, told) => {
    expect(() => commandLineOf(words)).toThrow(UsageError);
    expect(() => commandLineOf(words)).toThrow(told);
  });

  test('commandLineOf: every fault at once', () => {
    expect(() => commandLineOf(['--url', 'x', '--data='])).toThrow(/plan[\s\S]*--url[\s\S]*--data/);
  });
});
