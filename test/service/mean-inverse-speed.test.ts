import { describe, expect, test } from 'vitest';
import { MeanInverseSpeedAnswer } from '../../service/schemas/mean-inverse-speed.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const PATH = '/v1/halo/mean-inverse-speed';
const app = testApp();
const speeds = (...values: unknown[]) => ({ unit: 'km/s', values });

async function answered(body: unknown) {
  const response = await app.post(PATH, body);
  const text = await response.text();
  expect(response.status, text.slice(0, 300)).toBe(200);
  return MeanInverseSpeedAnswer.parse(JSON.parse(text));
}

describe(`POST ${PATH}`, () => {
  test(`POST ${PATH}: one value a speed, in their order; 0 from the largest speed on`, async () => {
    const { meanInverseSpeed, largestSpeed } = await answered({ speeds: speeds(600, 0, 794, 793, 600, 1e6) });
    const [a, b, c, d, e, f] = meanInverseSpeed.values;
    expect(meanInverseSpeed.unit).toBe('s/km');
    expect([c, f]).toEqual([0, 0]);
    expect(a).toBe(e);
    expect(b).toBeGreaterThan(a);
    expect(a).toBeGreaterThan(d);
    expect(d).toBeGreaterThan(0);
    expect(largestSpeed).toEqual({ value: 794, unit: 'km/s' });
  });

  test(`POST ${PATH}: its slopes and values are those of a halo at rest, worked out by hand`, async () => {
    // v_E = 0, sharp: η = 2 (e^−x² − e^−z²) / (√π v₀ N), N = erf z − 2 z e^−z² / √π; z = 1: N = 0.4275932955291202 (tables of erf)
    const halo = { circularSpeed: '300 km/s', escapeSpeed: '300 km/s', laboratorySpeed: '0 km/s' };
    const { meanInverseSpeed } = await answered({ halo, speeds: speeds(0, 150, 299) });
    const eta = (v: number) =>
      (2 * (Math.exp(-((v / 300) ** 2)) - Math.exp(-1))) / (Math.sqrt(Math.PI) * 300 * 0.4275932955291202);
    [0, 150, 299].forEach((v, i) => {
      expect(meanInverseSpeed.values[i] / eta(v)).toBeCloseTo(1, 9);
    });
  });

  test(`POST ${PATH}: the halo’s defaults and units are those of a scenario; its density does not matter`, async () => {
    const bare = await answered({ speeds: speeds(100, 300) });
    const halos = [
      {},
      { circularSpeed: '238000 m/s', cutoff: 'sharp' },
      { escapeSpeed: { value: 544, unit: 'km/s' }, laboratorySpeed: '250 km/s' },
      { localDensity: '7 GeV/cm^3' },
    ];
    for (const halo of halos) expect(await answered({ halo, speeds: speeds(100, 300) })).toEqual(bare);
    expect(await answered({ speeds: { unit: 'm/s', values: [100_000, 300_000] } })).toEqual(bare);
    expect(await answered({ halo: { cutoff: 'smooth' }, speeds: speeds(100, 300) })).not.toEqual(bare);
  });

  test(`POST ${PATH}: 10,000 speeds and no more`, async () => {
    const many = (count: number) => speeds(...Array.from({ length: count }, (_, i) => i / 10));
    expect((await answered({ speeds: many(10_000) })).meanInverseSpeed.values).toHaveLength(10_000);
    expect(await pointersOf(await app.post(PATH, { speeds: many(10_001) }))).toEqual(['/speeds/values']);
  });

  test.each<[string, unknown, readonly string[]]>([
    ['nothing', {}, ['/speeds']],
    ['no list', { speeds: { unit: 'km/s' } }, ['/speeds/values']],
    ['no unit', { speeds: { values: [1] } }, ['/speeds/unit']],
    ['an empty list', { speeds: speeds() }, ['/speeds/values']],
    ['a bare list', { speeds: [1, 2] }, ['/speeds']],
    ['the wrong unit', { speeds: { unit: 'kg', values: [1] } }, ['/speeds/unit']],
    ['a unit of 5,000 characters', { speeds: { unit: 'm'.repeat(5000), values: [1] } }, ['/speeds/unit']],
    [
      'speeds that are none',
      { speeds: speeds(-1, 'a', null, 5) },
      ['/speeds/values/0', '/speeds/values/1', '/speeds/values/2'],
    ],
    ['speeds beyond all numbers', { speeds: { unit: 'c', values: [1, 1e305] } }, ['/speeds/values/1']],
    ['unknown fields', { halo: { day: '2027-01-01' }, speeds: speeds(1), extra: 1 }, ['/halo/day', '/extra']],
    [
      'a faulty halo',
      { halo: { circularSpeed: 238, escapeSpeed: '2 c' }, speeds: speeds(1) },
      ['/halo/circularSpeed', '/halo/escapeSpeed'],
    ],
  ])(`POST ${PATH}: %s`, async (_what, body, pointers) => {
    expect(await pointersOf(await app.post(PATH, body))).toEqual(pointers);
  });

  test(`POST ${PATH}: carries Server-Timing`, async () => {
    const response = await app.post(PATH, { speeds: speeds(1) });
    expect(response.headers.get('server-timing')).toMatch(/^compute;dur=\d+(?:\.\d+)?$/);
  });
});
