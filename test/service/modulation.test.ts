import { describe, expect, it } from 'vitest';
import type { ModulationAnswer } from '../../service/schemas/modulation.ts';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import { changedAt, inventedScenario, type Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const PATH = '/v1/modulation';
const app = testApp();
const scenario: Json = {
  darkMatter: { mass: '50 MeV', referenceCrossSection: '1e-38 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 5 },
};

async function answered<T = ModulationAnswer>(body: Json, path = PATH): Promise<T> {
  const response = await app.post(path, body);
  const text = await response.text();
  expect(response.status, text.slice(0, 400)).toBe(200);
  expect(text).not.toMatch(/NaN|Infinity/);
  return JSON.parse(text) as T;
}
const ratesOf = (halo: Json, of = scenario): Promise<RatesAnswer> =>
  answered<RatesAnswer>({ ...of, halo }, '/v1/rates');

// Earth's speed through the halo from a general-purpose astronomy library's built-in ephemeris; 0.1 km/s
const SPEEDS: [string, number][] = [
  ['2026-06-02', 266.19],
  ['2026-03-21', 256.68],
  ['2026-12-02', 237.2],
  ['2026-09-23', 247.56],
];
const dates = SPEEDS.map(([date]) => date);

describe('POST /v1/modulation with dates', () => {
  it('has the laboratory’s speed and each bin’s rate at each date, in their order, as POST /v1/rates has them', async () => {
    const answer = await answered({ scenario, dates });
    expect(answer.dates).toEqual(dates);
    answer.laboratorySpeed.values.forEach((speed, i) => {
      expect(Math.abs(speed - SPEEDS[i][1])).toBeLessThan(0.1);
    });
    let compared = 0;
    for (const [i, date] of dates.entries()) {
      const { bins } = await ratesOf({ date });
      bins.forEach(({ rate }, bin) => {
        const value = answer.bins[bin].rates.values[i];
        expect(Math.abs(value / rate.value - 1)).toBeLessThan(1e-4); // the response's own bound
        compared++;
      });
    }
    expect(compared).toBe(20);
  });

  it('has arithmetic mean, (max − min)/2, their ratio and the day of the largest rate', async () => {
    const { bins, total } = await answered({ scenario, dates });
    expect(bins.map(({ electrons }) => electrons)).toEqual([1, 2, 3, 4, 5]);
    for (const { rates, mean, amplitude, fractionalAmplitude, maximum } of [...bins, total]) {
      const sum = rates.values.reduce((a, b) => a + b, 0);
      expect(mean.value / (sum / 4)).toBeCloseTo(1, 12);
      expect(amplitude.value).toBe((Math.max(...rates.values) - Math.min(...rates.values)) / 2);
      expect(fractionalAmplitude).toBe(amplitude.value / mean.value);
      expect(maximum).toBe(dates[rates.values.indexOf(Math.max(...rates.values))]);
      expect(mean.relativeError).toBeLessThan(1e-4);
    }
  });

  it('takes the day of the maximum in UTC, and dates as they were written', async () => {
    const written = ['2026-06-02T23:30:00-02:00', '2026-12-01'];
    const answer = await answered({ scenario, dates: written });
    expect(answer.dates).toEqual(written);
    expect(answer.bins[3].maximum).toBe('2026-06-03');
  });
});

describe('POST /v1/modulation with a year', () => {
  it('is every day of it; the most of the upper bins within a day of 2 to 3 June, mean speed 252.1 km/s', async () => {
    const { dates: days, laboratorySpeed, bins } = await answered({ scenario, year: 2026 });
    expect([days.length, days[0], days[364]]).toEqual([365, '2026-01-01', '2026-12-31']);
    const mean = laboratorySpeed.values.reduce((a, b) => a + b, 0) / 365;
    expect(Math.abs(mean - 252.1)).toBeLessThan(0.1);
    expect(bins[4].maximum).toMatch(/^2026-06-0[1-4]$/);
    expect(bins[4].fractionalAmplitude).toBeGreaterThan(0.01);
    expect((await answered({ scenario, year: 2028 })).dates).toHaveLength(366);
  });

  it('has the amplitude of the derivative in v_E where the modulation is small', async () => {
    const { laboratorySpeed, bins } = await answered({ scenario, year: 2026 });
    const [slow, fast] = [Math.min(...laboratorySpeed.values), Math.max(...laboratorySpeed.values)];
    const [below, above] = await Promise.all([251, 253].map((speed) => ratesOf({ laboratorySpeed: `${speed} km/s` })));
    for (const bin of [1, 2, 3, 4]) {
      const slope = (above.bins[bin].rate.value - below.bins[bin].rate.value) / 2;
      const expected = (slope * (fast - slow)) / 2;
      expect(bins[bin].amplitude.value / Math.abs(expected)).toBeCloseTo(1, 1); // curvature is what is left out
    }
  });
});

describe('POST /v1/modulation exposure', () => {
  const background = {
    name: 'flat',
    kind: 'perBin',
    rates: [
      { electrons: 2, rate: '100 1/(kg yr)' },
      { electrons: 3, rate: '50 1/(kg yr)' },
    ],
  };

  it('is Z² over Σ A²/[2 (S̄ + B)] in the goal’s window, and goes with Z²', async () => {
    const goal = { kind: 'events', count: 3, window: { from: 2, to: 4 } };
    const body = { scenario: { ...scenario, backgrounds: [background], goal }, year: 2027 };
    const { exposure, bins } = await answered(body);
    expect(exposure.significance).toBe(3);
    expect(exposure.bins.map((bin) => [bin.electrons, bin.background.value])).toEqual([
      [2, 100],
      [3, 50],
      [4, 0],
    ]);
    const perKgYr = exposure.bins.reduce(
      (sum, { annualAmplitude: a, signal: s, background: b }) => sum + a.value ** 2 / (2 * (s.value + b.value)),
      0,
    );
    expect(exposure.needed!.value * perKgYr).toBeCloseTo(9, 9);
    for (const { electrons, signal, annualAmplitude } of exposure.bins) {
      expect(signal.value / bins[electrons - 1].mean.value).toBeCloseTo(1, 12);
      expect(annualAmplitude.value / bins[electrons - 1].amplitude.value).toBeCloseTo(1, 1);
    }
    const six = await answered({ ...body, significance: 6 });
    expect(six.exposure.needed!.value / exposure.needed!.value).toBeCloseTo(4, 9);
  });

  it('of dates is that of the first one’s year, within 1e-3', async () => {
    const [year, list] = await Promise.all([
      answered({ scenario, year: 2026 }),
      answered({ scenario, dates: ['2026-02-03', '2027-02-03'] }),
    ]);
    expect(list.exposure.needed!.value / year.exposure.needed!.value).toBeCloseTo(1, 3);
  });

  it('is in measured bins: an efficiency of ½ doubles it', async () => {
    const [whole, half] = await Promise.all(
      [1, 0.5].map((efficiency) => answered({ scenario: { ...scenario, readout: { efficiency } }, year: 2027 })),
    );
    expect(half.exposure.needed!.value / whole.exposure.needed!.value).toBeCloseTo(2, 9);
    expect(half.bins).toEqual(whole.bins);
  });

  it('is null with a notice where nothing is reached; no maximum then', async () => {
    const light = changedAt(scenario, '/darkMatter/mass', '0.1 MeV');
    const { exposure, bins, notices } = await answered({ scenario: light, year: 2027 });
    expect(exposure.needed).toBeNull();
    expect(notices.map(({ code }) => code)).toEqual(expect.arrayContaining(['unreachable-bins', 'goal-unreachable']));
    expect(bins[0]).toMatchObject({ mean: { value: 0 }, fractionalAmplitude: 0, maximum: null });
  });
});

describe('POST /v1/modulation', () => {
  it('does not use the laboratory speed of the scenario, says so, and hashes the same without it', async () => {
    const bare = await answered({ scenario, dates });
    const given = await answered({ scenario: { ...scenario, halo: { laboratorySpeed: '300 km/s' } }, dates });
    expect(given.bins).toEqual(bare.bins);
    expect(given.provenance).toEqual(bare.provenance);
    expect(given.notices.map(({ code }) => code)).toContain('laboratory-speed-not-used');
    for (const halo of [
      { laboratorySpeed: '250 km/s' },
      { peculiarVelocity: ['11.1 km/s', '12.2 km/s', '7.3 km/s'] },
    ]) {
      const answer = await answered({ scenario: { ...scenario, halo }, dates });
      expect(answer.notices).toEqual(bare.notices);
      expect(answer.bins).toEqual(bare.bins);
    }
  });

  it('shows a stream against the Sun’s way, with components, stronger than the halo', async () => {
    const stream = { dispersion: '10 km/s', meanVelocity: { unit: 'km/s', values: [0, -300, 0] } };
    const halo = {
      model: 'components',
      components: [
        { dispersion: '168 km/s', weight: 0.9 },
        { ...stream, weight: 0.1 },
      ],
    };
    const [both, alone] = await Promise.all([
      answered({ scenario: { ...scenario, halo }, dates }),
      answered({ scenario, dates }),
    ]);
    expect(both.bins[4].fractionalAmplitude).not.toBeCloseTo(alone.bins[4].fractionalAmplitude, 3);
    const { bins } = await ratesOf({ ...halo, date: dates[0] });
    both.bins.forEach(({ rates }, bin) => {
      expect(Math.abs(rates.values[0] / bins[bin].rate.value - 1)).toBeLessThan(1e-4);
    });
  });

  it('answers with the same bytes again', async () => {
    const [a, b] = [await app.post(PATH, { scenario, dates }), await app.post(PATH, { scenario, dates })];
    expect(await a.text()).toBe(await b.text());
  });

  const table = { kind: 'laboratory', speeds: { unit: 'km/s', values: [0, 1] }, values: [0, 1] };
  it.each<[string, Json, string[]]>([
    ['neither year nor dates', { scenario }, ['']],
    ['both', { scenario, year: 2027, dates }, ['']],
    ['a year out of range', { scenario, year: 1949 }, ['/year']],
    ['half a year', { scenario, year: 2027.5 }, ['/year']],
    ['no dates', { scenario, dates: [] }, ['/dates']],
    [
      'dates that are none or out of range',
      { scenario, dates: ['2027-01-01', 'May', '2101-01-01'] },
      ['/dates/1', '/dates/2'],
    ],
    ['a significance of 0', { scenario, year: 2027, significance: 0 }, ['/significance']],
    [
      'a table in the laboratory',
      { scenario: { ...scenario, halo: { model: 'tabulated', tabulated: table } }, year: 2027 },
      ['/scenario/halo/tabulated/kind'],
    ],
    [
      'what belongs to rates',
      { scenario: { ...scenario, spectrum: true, uncertainty: {} }, year: 2027 },
      ['/scenario/uncertainty', '/scenario/spectrum'],
    ],
    [
      'an unknown crystal',
      { scenario: { ...scenario, crystal: { id: 'nowhere' } }, year: 2027 },
      ['/scenario/crystal/id'],
    ],
    [
      'a gap that is missing',
      { scenario: changedAt(inventedScenario(), '/crystal/bandGap', undefined), year: 2027 },
      ['/scenario/ionization/bandGap'],
    ],
    [
      'a halo too fast',
      { scenario: { ...scenario, halo: { escapeSpeed: '0.9999 c' } }, year: 2027 },
      ['/scenario/halo'],
    ],
    [
      'a rotation too fast',
      { scenario: { ...scenario, halo: { circularSpeed: '299780 km/s' } }, year: 2027 },
      ['/scenario/halo/circularSpeed'],
    ],
  ])('POST /v1/modulation, %s: told where', async (_, body, pointers) => {
    expect(await pointersOf(await app.post(PATH, body))).toEqual(pointers);
  });
});
