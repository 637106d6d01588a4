/** POST /v1/rates with `response`: what a halo-independent study takes away. */
import { describe, expect, it } from 'vitest';
import type { MeanInverseSpeedAnswer } from '../../service/schemas/mean-inverse-speed.ts';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import { changedAt, type Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const scenario: Json = {
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-38 cm^2', mediator: 'light' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 4 },
};

async function answered<T>(path: string, body: Json): Promise<T> {
  const response = await app.post(path, body);
  const text = await response.text();
  expect(response.status, text.slice(0, 400)).toBe(200);
  return JSON.parse(text) as T;
}

describe('POST /v1/rates with response', () => {
  it('gives the rates of other halos with η from POST /v1/halo/mean-inverse-speed, within 1e-3', async () => {
    const { response } = await answered<RatesAnswer>('/v1/rates', { ...scenario, response: true });
    const { speeds, kernels } = response!;
    expect(kernels.map(({ electrons }) => electrons)).toEqual([1, 2, 3, 4]);
    const middles = speeds.edges.slice(1).map((edge, i) => (edge + speeds.edges[i]) / 2);
    const halos: Json[] = [
      {},
      { circularSpeed: '220 km/s', escapeSpeed: '600 km/s', date: '2027-06-02' },
      { model: 'components', components: [{ dispersion: { unit: 'km/s', values: [230, 120, 110] } }] },
    ];
    for (const halo of halos) {
      const eta = await answered<ReturnType<typeof MeanInverseSpeedAnswer.parse>>('/v1/halo/mean-inverse-speed', {
        halo,
        speeds: { unit: 'km/s', values: middles },
      });
      const { bins } = await answered<RatesAnswer>('/v1/rates', { ...scenario, halo });
      kernels.forEach(({ values }, bin) => {
        expect(values.values).toHaveLength(middles.length);
        const rate = values.values.reduce(
          (sum, k, i) => sum + k * eta.meanInverseSpeed.values[i] * (speeds.edges[i + 1] - speeds.edges[i]),
          0,
        );
        expect(Math.abs(rate / bins[bin].rate.value - 1)).toBeLessThan(1e-3); // η at the middle stands for the cell
      });
    }
  });

  it('integrates to the rate over a step in η: a stream of one speed', async () => {
    const halo = {
      model: 'components',
      components: [{ dispersion: '0 km/s', meanVelocity: ['0 km/s', '-300 km/s', '0 km/s'] }],
    };
    const {
      response,
      bins,
      halo: facts,
    } = await answered<RatesAnswer>('/v1/rates', { ...scenario, halo, response: true });
    const { edges } = response!.speeds;
    const step = facts!.largestSpeed.value;
    response!.kernels.forEach(({ values }, bin) => {
      const sum = values.values.reduce(
        (total, k, i) => total + k * Math.max(0, Math.min(edges[i + 1], step) - edges[i]),
        0,
      );
      if (bins[bin].rate.value > 0) expect(sum / step / bins[bin].rate.value).toBeCloseTo(1, 2);
    });
    expect(bins[1].rate.value).toBeGreaterThan(0);
  });

  it('leaves rates and their hash alone where it is not asked for, and is empty where nothing is reached', async () => {
    const bare = await answered<RatesAnswer>('/v1/rates', scenario);
    expect(bare).not.toHaveProperty('response');
    expect(await answered<RatesAnswer>('/v1/rates', { ...scenario, response: false })).toEqual(bare);
    const { response, provenance, ...rest } = await answered<RatesAnswer>('/v1/rates', { ...scenario, response: true });
    expect({ ...rest, provenance: bare.provenance }).toEqual(bare);
    expect(provenance.request.sha256).not.toBe(bare.provenance.request.sha256);
    const light = { ...changedAt(scenario, '/darkMatter/mass', '0.05 MeV'), response: true };
    const nothing = (await answered<RatesAnswer>('/v1/rates', light)).response!;
    expect(nothing.speeds.edges).toEqual([]);
    expect(nothing.kernels.map(({ values }) => values.values)).toEqual([[], [], [], []]);
    expect(response!.speeds.edges.length).toBeGreaterThan(100);
  });

  it('is refused where it is no flag, for halos as fast as light, and where it is not offered', async () => {
    expect(await pointersOf(await app.post('/v1/rates', { ...scenario, response: 'yes' }))).toEqual(['/response']);
    const fast = { ...scenario, halo: { escapeSpeed: '0.9 c', laboratorySpeed: '0.2 c' }, response: true };
    expect(await pointersOf(await app.post('/v1/rates', fast))).toEqual(['/halo']);
    const goal = { kind: 'events', count: 3 };
    const elsewhere = { scenario: { ...scenario, goal, response: true }, windowFrom: [1] };
    expect(await pointersOf(await app.post('/v1/trade-offs', elsewhere))).toEqual(['/scenario/response']);
  });
});
