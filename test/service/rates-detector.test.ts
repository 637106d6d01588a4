import { describe, expect, it } from 'vitest';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import { changedAt, inventedScenario, type Json } from '../support/invented.ts';
import { pointersOf, problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();

async function rates(scenario: Json): Promise<RatesAnswer> {
  const response = await app.post('/v1/rates', scenario);
  const text = await response.text();
  expect(response.status, text.slice(0, 500)).toBe(200);
  return JSON.parse(text) as RatesAnswer;
}

const silicon = (over: Json = {}): Json => ({
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-40 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 8 },
  ...over,
});

const darkCurrent = (over: Json = {}): Json => ({
  name: 'dark current',
  kind: 'darkCurrent',
  current: '1e-4 1/day',
  pixelMass: '0.35 ug',
  readoutInterval: '1 day',
  ...over,
});

const codes = ({ notices }: RatesAnswer): string[] => notices.map(({ code }) => code);

describe('POST /v1/rates: ionization models', () => {
  it('fano with factor 0 is the step model exactly, and a small factor is near it', async () => {
    const step = await rates(silicon());
    const zero = await rates(silicon({ ionization: { maxElectrons: 8, model: 'fano', fanoFactor: 0 } }));
    expect(zero.bins).toEqual(step.bins);
    const small = await rates(silicon({ ionization: { maxElectrons: 8, model: 'fano', fanoFactor: 1e-5 } }));
    small.bins.forEach(({ rate }, i) => {
      if (step.bins[i].rate.value > 1e-3) expect(rate.value / step.bins[i].rate.value).toBeCloseTo(1, 3);
    });
  });

  it('fano conserves the rate: bins and overflow add up to those of the step model', async () => {
    const sum = ({ total, overflow }: RatesAnswer): number => total.value + overflow.value;
    const step = await rates(silicon());
    const fano = await rates(silicon({ ionization: { maxElectrons: 8, model: 'fano', fanoFactor: 0.12 } }));
    expect(sum(fano) / sum(step)).toBeCloseTo(1, 7);
    expect(fano.bins[2].rate.value).not.toBeCloseTo(step.bins[2].rate.value, 3);
    for (const { rate } of fano.bins) expect(rate.relativeError).toBeGreaterThanOrEqual(2e-5); // the segment rule's share
  });

  it('a table that says what the step model says gives its rates; what its rows lack is reported as lost', async () => {
    const energies = { unit: 'eV', values: [1.12, 4.9199999, 4.92, 8.7199999, 8.72, 60] };
    const rows = [
      [1, 0, 0],
      [1, 0, 0],
      [0, 1, 0],
      [0, 1, 0],
      [0, 0, 0.5],
      [0, 0, 0.5],
    ];
    const step = await rates(silicon({ ionization: { maxElectrons: 3 } }));
    const table = await rates(
      silicon({ ionization: { maxElectrons: 3, model: 'table', table: { energies, probabilities: rows } } }),
    );
    expect(table.bins[0].rate.value / step.bins[0].rate.value).toBeCloseTo(1, 5);
    expect(table.bins[1].rate.value / step.bins[1].rate.value).toBeCloseTo(1, 5);
    const above = step.bins[2].rate.value + step.overflow.value;
    expect(table.bins[2].rate.value / (above / 2)).toBeCloseTo(1, 5);
    expect((table.lostCharge?.value ?? 0) / (above / 2)).toBeCloseTo(1, 5);
    expect(table.overflow.value).toBe(0);
  });

  it('a stored charge table gives the same answer as the same one inline; an unknown id is a fault', async () => {
    const own = {
      energies: { unit: 'eV', values: [1.2, 20] },
      probabilities: [
        [1, 0],
        [0.2, 0.8],
      ],
    };
    const stored = await app.post('/v1/charge-tables', { name: 'Invented', ...own });
    expect(stored.status).toBe(201);
    const { id } = (await stored.json()) as { id: string };
    const ask = (table: unknown) => rates(silicon({ ionization: { maxElectrons: 3, model: 'table', table } }));
    expect((await ask({ id })).bins).toEqual((await ask(own)).bins);
    const unknown = await app.post(
      '/v1/rates',
      silicon({ ionization: { model: 'table', table: { id: 'f'.repeat(64) } } }),
    );
    expect(await pointersOf(unknown)).toEqual(['/ionization/table/id']);
  });
});

describe('POST /v1/rates: readout and backgrounds', () => {
  it('no noise and efficiency 1 measure the true electrons exactly; nothing is measured that was not asked for', async () => {
    const plain = await rates(silicon());
    expect(plain.measured).toBeUndefined();
    const { measured, bins } = await rates(silicon({ readout: {} }));
    expect(measured!.bins.map(({ electrons }) => electrons)).toEqual([0, 1, 2, 3, 4, 5, 6, 7, 8]);
    expect(measured!.bins[0].signal.value).toBe(0);
    measured!.bins.slice(1).forEach(({ signal }, i) => expect(signal).toEqual(bins[i].rate));
  });

  it('noise moves rate between bins and loses none; the matrix comes on request and its rows sum to 1', async () => {
    const { measured, total, overflow } = await rates(
      silicon({ ionization: { maxElectrons: 20 }, readout: { noise: 0.4, responseMatrix: true } }),
    );
    const sum = measured!.bins.reduce((all, { signal }) => all + signal.value, 0);
    expect(sum / (total.value + overflow.value)).toBeCloseTo(1, 9);
    expect(measured!.bins[0].signal.value).toBeGreaterThan(0);
    const matrix = measured!.responseMatrix!;
    for (const row of matrix) expect(row.reduce((a, b) => a + b, 0)).toBeCloseTo(1, 13);
    // Φ(1.25) − Φ(−1.25), standard normal table
    expect(matrix[3][3]).toBeCloseTo(0.788700453, 8);
  });

  it('efficiency multiplies signal and every background but those given per bin', async () => {
    const backgrounds = [
      darkCurrent(),
      { name: 'flat', kind: 'flat', rate: '1000 1/(kg yr keV)' },
      { name: 'seen', kind: 'perBin', rates: [{ electrons: 2, rate: '5 1/(kg yr)' }] },
    ];
    const full = await rates(silicon({ backgrounds, readout: { efficiency: 1 } }));
    const half = await rates(silicon({ backgrounds, readout: { efficiency: 0.5 } }));
    const perBin = await rates(silicon({ backgrounds, readout: { efficiency: [1, 1, 0.25, 1, 1, 1, 1, 1, 1] } }));
    expect(half.measured!.bins[3].signal.value).toBeCloseTo(full.measured!.bins[3].signal.value / 2, 12);
    const at2 = ({ measured }: RatesAnswer): number[] =>
      measured!.backgrounds.map(({ rates: { values } }) => values[2]);
    expect(at2(full)[1]).toBeCloseTo(3.8, 9); // 1000 per keV in 3.8 eV
    expect(at2(half)).toEqual([at2(full)[0] / 2, at2(full)[1] / 2, 5]);
    expect(at2(perBin)).toEqual([at2(full)[0] / 4, at2(full)[1] / 4, 5]);
    expect(full.measured!.bins[2].background.value).toBeCloseTo(
      at2(full).reduce((a, b) => a + b, 0),
      9,
    );
  });

  it('dark current per pixel: λ^n e^{−λ}/n! over pixel mass and interval, empty pixels included', async () => {
    const { measured } = await rates(silicon({ backgrounds: [darkCurrent()] }));
    const [rows] = measured!.backgrounds;
    const readings = 365.25 / 0.35e-9; // of pixels, per kg yr, one a day
    [1, 1e-4, 1e-8 / 2, 1e-12 / 6].forEach((power, n) =>
      expect(rows.rates.values[n] / (readings * power * Math.exp(-1e-4))).toBeCloseTo(1, 10),
    );
  });

  it('noise without a dark current brings a notice, with one (also of zero current) none', async () => {
    expect(codes(await rates(silicon({ readout: { noise: 0.2 } })))).toContain('noise-without-dark-current');
    const zero = await rates(silicon({ readout: { noise: 0.2 }, backgrounds: [darkCurrent({ current: '0 1/day' })] }));
    expect(codes(zero)).not.toContain('noise-without-dark-current');
    expect(zero.measured!.backgrounds[0].rates.values[1]).toBeGreaterThan(0); // empty pixels read as charged
  });
});

describe('POST /v1/rates: goals over backgrounds', () => {
  const window = { from: 2, to: 8 };
  const goals = [
    { kind: 'exclusion', confidence: 0.9, window },
    { kind: 'exclusion', confidence: 0.9, method: 'unified', window },
    { kind: 'exclusion', confidence: 0.9, method: 'likelihood', window },
    { kind: 'discovery', significance: 3, window },
  ];

  it('without background: 2.303 events for 90 % (PDG), 2.44 unified (Feldman & Cousins 1998), 3 for a discovery', async () => {
    const expected = [Math.log(10), 2.44, Math.log(10), 3];
    for (const [i, goal] of goals.entries()) {
      const { exposure } = await rates(silicon({ goal }));
      expect(Math.abs(exposure!.expectedSignal! - expected[i]), JSON.stringify(goal)).toBeLessThan(0.01);
      expect(exposure!.needed!.value * exposure!.signalRate.value).toBeCloseTo(exposure!.expectedSignal!, 9);
      expect(exposure!.expectedBackground).toBe(0);
    }
  });

  it('more background needs more exposure, and the window counts measured electrons', async () => {
    for (const goal of goals) {
      let least = 0;
      for (const current of ['1e-6 1/day', '1e-5 1/day', '1e-4 1/day']) {
        const { exposure } = await rates(
          silicon({ goal, backgrounds: [darkCurrent({ current })], readout: { noise: 0.15 } }),
        );
        expect(exposure!.needed!.value).toBeGreaterThanOrEqual(least); // equal where the minimum of events binds
        least = exposure!.needed!.value;
      }
    }
  });

  it('an uncertain background caps the significance: needed null, the cap, and a notice that says why', async () => {
    const backgrounds = [darkCurrent({ relativeUncertainty: 0.3 })];
    const scenario = silicon({ backgrounds, goal: { kind: 'discovery', significance: 5, window: { from: 2, to: 2 } } });
    const answer = await rates(scenario);
    expect(answer.exposure).toMatchObject({
      needed: null,
      expectedSignal: null,
      binding: null,
      requiredSignificance: 5,
    });
    expect(answer.exposure!.largestSignificance).toBeLessThan(5);
    expect(codes(answer)).toContain('goal-unreachable');
  });

  it('check: simulated experiments beside the formula, the same for the same seed', async () => {
    const goal = {
      kind: 'discovery',
      significance: 5,
      window: { from: 2, to: 2 },
      check: { experiments: 2000, seed: 7 },
    };
    const scenario = silicon({ goal, backgrounds: [darkCurrent({ relativeUncertainty: 0.001 })] });
    const [first, again] = [await rates(scenario), await rates(scenario)];
    expect(again).toEqual(first);
    const { check } = first.exposure!;
    expect(check).toMatchObject({ experiments: 2000, seed: 7, quantity: 'median-significance' });
    expect(check!.expected).toBeCloseTo(5, 6);
    expect(Math.abs(check!.achieved - 5)).toBeLessThan(0.05 * 5 + 5 * check!.standardError);
    const other = await rates(changedAt(scenario, '/goal/check/seed', 8));
    expect(other.exposure!.check!.achieved).not.toBe(check!.achieved);
    expect(other.exposure!.needed).toEqual(first.exposure!.needed);
  });

  it('payload: live mass × time sets the date, and the live fraction only that', async () => {
    const goal = { kind: 'events', count: 3, window };
    const plain = await rates(silicon({ goal, payload: { mass: '100 g', start: '2027-03-01' } }));
    const half = await rates(silicon({ goal, payload: { mass: '100 g', livetimeFraction: 0.5, start: '2027-03-01' } }));
    const needed = plain.exposure!.needed!.value;
    expect(half.exposure!.needed!.value).toBe(needed);
    expect(plain.exposure!.calendar!.duration!.value).toBeCloseTo((needed / 0.1) * 365.25, 9);
    expect(half.exposure!.calendar!.duration!.value).toBeCloseTo((2 * needed * 365.25) / 0.1, 9);
    const day = Date.parse('2027-03-01') + plain.exposure!.calendar!.duration!.value * 86_400_000;
    expect(plain.exposure!.calendar!.reached).toBe(new Date(day).toISOString().slice(0, 10));
    const stages = [
      { mass: '1 g', start: '2027-03-01' },
      { mass: '1 kg', start: '2027-03-11T12:00:00Z' },
    ];
    const staged = await rates(silicon({ goal, payload: { stages } }));
    const remaining = needed * 365.25 - 0.001 * 10.5;
    expect(staged.exposure!.calendar!.duration!.value).toBeCloseTo(10.5 + remaining, 9);
    expect((await rates(silicon({ goal, payload: { mass: '1 g' } }))).exposure!.calendar!.reached).toBeNull();
  });
});

describe('POST /v1/rates: a detector that contradicts itself', () => {
  const goal = { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 8 } };
  const base = silicon({ goal, readout: { noise: 0.2 }, backgrounds: [darkCurrent()] });
  const perBin = { name: 'seen', kind: 'perBin', rates: [{ electrons: 2, rate: '5 1/(kg yr)' }] };
  const cases: [string, unknown, string[]][] = [
    ['/ionization', { model: 'fano' }, ['/ionization/fanoFactor']],
    ['/ionization', { fanoFactor: 0.1 }, ['/ionization/fanoFactor']],
    ['/ionization', { model: 'fano', fanoFactor: -1 }, ['/ionization/fanoFactor']],
    ['/ionization', { model: 'table' }, ['/ionization/table']],
    [
      '/ionization',
      {
        model: 'table',
        table: {
          energies: { unit: 'eV', values: [2, 1] },
          probabilities: [
            [0.7, 0.7],
            [0.5, -1],
          ],
        },
      },
      [
        '/ionization/table/energies/values/1',
        '/ionization/table/probabilities/0',
        '/ionization/table/probabilities/1/1',
      ],
    ],
    ['/readout/noise', -0.1, ['/readout/noise']],
    ['/readout/efficiency', 1.5, ['/readout/efficiency']],
    ['/readout/efficiency', [1, 1], ['/readout/efficiency']],
    ['/readout/efficiency', [1, 2], ['/readout/efficiency/1', '/readout/efficiency']],
    ['/goal/window', { from: 5, to: 4 }, ['/goal/window/to']],
    ['/goal/window', { from: 0, to: 4 }, ['/goal/window/from']],
    ['/goal/window', { from: 9, to: 10 }, ['/goal/window/from', '/goal/window/to']],
    ['/goal/confidence', 1, ['/goal/confidence']],
    ['/goal/method', 'guess', ['/goal/method']],
    ['/goal/check', { experiments: 5, seed: -1 }, ['/goal/check/experiments', '/goal/check/seed']],
    ['/backgrounds/0/relativeUncertainty', 0.2, ['/backgrounds/0/relativeUncertainty']],
    ['/backgrounds/0/current', '1e-4', ['/backgrounds/0/current']],
    ['/backgrounds/0/pixelMass', '0 ug', ['/backgrounds/0/pixelMass']],
    ['/backgrounds/0/kind', 'other', ['/backgrounds/0/kind']],
    ['/backgrounds', [perBin, perBin], ['/backgrounds/1/name']],
    [
      '/backgrounds/0',
      {
        ...perBin,
        rates: [
          { electrons: 9, rate: '1 1/(kg yr)' },
          { electrons: 9, rate: 5 },
        ],
      },
      [
        '/backgrounds/0/rates/1/rate',
        '/backgrounds/0/rates/0/electrons',
        '/backgrounds/0/rates/1/electrons',
        '/backgrounds/0/rates/1/electrons',
      ],
    ],
    ['/payload', { mass: '1 kg', livetimeFraction: 0 }, ['/payload/livetimeFraction']],
    [
      '/payload',
      {
        stages: [
          { mass: '1 kg', start: '2027-02-01' },
          { mass: '1 kg', start: '2027-01-01' },
        ],
      },
      ['/payload/stages/1/start'],
    ],
    ['/payload', { mass: '1 kg', start: 'next spring' }, ['/payload/start']],
  ];
  it.each(cases)('%s: %j', async (pointer, value, expected) => {
    const pointers = await pointersOf(await app.post('/v1/rates', changedAt(base, pointer, value)));
    expect([...pointers].sort()).toEqual([...expected].sort());
  });

  it('counting and unified refuse uncertain backgrounds, naming likelihood', async () => {
    for (const method of ['counting', 'unified']) {
      const scenario = changedAt(changedAt(base, '/goal/method', method), '/backgrounds/0/relativeUncertainty', 0.2);
      const problem = await problemOf(await app.post('/v1/rates', scenario), 'invalid-input');
      expect(problem.errors![0].detail).toContain('"likelihood"');
    }
  });

  it('a charge table with charge below the gap that the crystal brings', async () => {
    const table = { energies: { unit: 'eV', values: [0.5, 20] }, probabilities: [[1], [1]] };
    const response = await app.post('/v1/rates', inventedScenario({ ionization: { model: 'table', table } }));
    expect(await pointersOf(response)).toEqual(['/ionization/table/probabilities/0']);
  });
});
