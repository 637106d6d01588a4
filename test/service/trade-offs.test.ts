import { describe, expect, it } from 'vitest';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import type { TradeOffsAnswer } from '../../service/schemas/trade-offs.ts';
import { changedAt, type Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const scenario: Json = {
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-39 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 8 },
  readout: { noise: 0.12 },
  backgrounds: [
    {
      name: 'dark current',
      kind: 'darkCurrent',
      current: '1e-4 1/day',
      pixelMass: '0.35 ug',
      readoutInterval: '1 day',
    },
  ],
  goal: { kind: 'exclusion', confidence: 0.9 },
};
const request: Json = { scenario, windowFrom: [1, 2, 3], readoutInterval: { unit: 'h', values: [6, 24] } };

describe('POST /v1/trade-offs', () => {
  it('gives each choice the exposure that POST /v1/rates gives it, and names the cheapest', async () => {
    const response = await app.post('/v1/trade-offs', request);
    expect(response.status).toBe(200);
    const answer = (await response.json()) as TradeOffsAnswer;
    expect(answer.choices.map((c) => [c.windowFrom, c.readoutInterval?.value])).toEqual([
      [1, 0.25],
      [1, 1],
      [2, 0.25],
      [2, 1],
      [3, 0.25],
      [3, 1],
    ]);
    for (const choice of answer.choices) {
      const single = changedAt(
        changedAt(scenario, '/goal/window', { from: choice.windowFrom, to: 8 }),
        '/backgrounds/0/readoutInterval',
        `${choice.readoutInterval!.value} day`,
      );
      const { exposure } = (await (await app.post('/v1/rates', single)).json()) as RatesAnswer;
      expect(choice.exposure).toEqual(exposure);
    }
    const least = Math.min(...answer.choices.map((c) => c.exposure.needed!.value));
    expect(answer.cheapest!.exposure.needed!.value).toBe(least);
    expect(answer.notices.map(({ code }) => code)).toContain('planning-estimate');
  });

  it('n-electron pile-up grows as interval^(n − 1): fourfold interval, fourfold pairs', async () => {
    const quiet = changedAt(request, '/scenario/readout', undefined);
    const answer = (await (
      await app.post('/v1/trade-offs', changedAt(quiet, '/windowFrom', [2]))
    ).json()) as TradeOffsAnswer;
    const [short, long] = answer.choices.map((c) => c.exposure.backgroundRate.value);
    expect(long / short).toBeCloseTo(4, 3);
  });

  it.each([
    ['/windowFrom', undefined, '/readoutInterval', undefined, ['']],
    ['/windowFrom', [9], '/readoutInterval', undefined, ['/windowFrom/0']],
    ['/scenario/goal', undefined, '/windowFrom', [0], ['/windowFrom/0', '/scenario/goal']],
    ['/scenario/backgrounds', [], '/windowFrom', [2], ['/readoutInterval']],
    ['/readoutInterval', { unit: 'kg', values: [1] }, '/windowFrom', [2], ['/readoutInterval/unit']],
    [
      '/scenario/crystal/id',
      'nowhere',
      '/scenario/darkMatter/mass',
      5,
      ['/scenario/darkMatter/mass', '/scenario/crystal/id'],
    ],
    ['/scenario/crystal/id', 'nowhere', '/windowFrom', [2], ['/scenario/crystal/id']],
  ] as [string, unknown, string, unknown, string[]][])(
    '%s %j, %s %j: told where',
    async (first, a, second, b, expected) => {
      const response = await app.post('/v1/trade-offs', changedAt(changedAt(request, first, a), second, b));
      expect([...(await pointersOf(response))].sort()).toEqual([...expected].sort());
    },
  );
});
