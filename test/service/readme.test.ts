import fs from 'node:fs';
import { describe, expect, it } from 'vitest';
import { testApp } from '../support/test-app.ts';

const readme = fs.readFileSync(new URL('../../README.md', import.meta.url), 'utf8');
const { version } = JSON.parse(fs.readFileSync(new URL('../../package.json', import.meta.url), 'utf8')) as {
  version: string;
};

/** Every curl call that is followed by its answer: path, body, answer. */
const CALLS = [
  ...readme.matchAll(/```sh\ncurl -s http:\/\/127\.0\.0\.1:8087(\S+) .*? -d '(.*?)'\n```\n\n```json\n(.*?)\n```/gs),
];
/** Every other JSON block is a scenario, as it stands. */
const SCENARIOS = [...readme.matchAll(/```json\n(\{\n.*?\n\})\n```/gs)];

describe('README', () => {
  it('has three calls, and their answers are what the service answers', async () => {
    const app = testApp({ version });
    expect(CALLS).toHaveLength(3);
    for (const [, path, body, answer] of CALLS) {
      const response = await app.post(path, body);
      expect(await response.json(), path).toEqual(JSON.parse(answer));
    }
  });

  it('has a worked example that the service answers with the exposure in its table', async () => {
    const [[, body]] = SCENARIOS;
    const scenario = JSON.parse(body) as Record<string, unknown>;
    const needed = async (over: object): Promise<string> => {
      const response = await testApp().post('/v1/rates', { ...scenario, ...over });
      const { exposure } = (await response.json()) as {
        exposure: { needed: { value: number }; calendar: { reached: string } };
      };
      return `${(exposure.needed.value * 1e3).toPrecision(3)} g yr, ${exposure.calendar.reached}`;
    };
    const [dark] = scenario['backgrounds'] as object[];
    expect(await needed({ backgrounds: [] })).toBe('46.5 g yr, 2027-09-29');
    expect(await needed({})).toBe('7.77e+3 g yr, 2124-03-28');
    const goal = { kind: 'exclusion', confidence: 0.9, window: { from: 3, to: 10 } };
    expect(await needed({ goal })).toBe('138 g yr, 2028-11-18');
    const likelihood = { ...goal, method: 'likelihood', window: { from: 2, to: 10 } };
    expect(await needed({ goal: likelihood, backgrounds: [{ ...dark, readoutInterval: '2 h' }] })).toBe(
      '78.2 g yr, 2028-02-20',
    );
    for (const text of [
      '46.5 g yr',
      '7.77 kg yr',
      '138 g yr',
      '78.2 g yr',
      '29 September 2027',
      '18 November 2028',
      '20 February 2028',
    ])
      expect(readme).toContain(text);
  });
});
