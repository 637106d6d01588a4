/** The halo of a request: dates, models and what is refused of them, wherever a halo can stand. */
import { describe, expect, it } from 'vitest';
import type { MeanInverseSpeedAnswer } from '../../service/schemas/mean-inverse-speed.ts';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import type { ReachAnswer } from '../../service/schemas/reach.ts';
import type { TradeOffsAnswer } from '../../service/schemas/trade-offs.ts';
import type { Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const ETA = '/v1/halo/mean-inverse-speed';
const app = testApp();
const GRID = Array.from({ length: 161 }, (_, i) => 5 * i);

async function answered<T>(path: string, body: Json): Promise<T> {
  const response = await app.post(path, body);
  const text = await response.text();
  expect(response.status, text.slice(0, 400)).toBe(200);
  return JSON.parse(text) as T;
}

type Eta = ReturnType<typeof MeanInverseSpeedAnswer.parse>;
const etaOf = (halo: Json, over: Json = {}): Promise<Eta> =>
  answered<Eta>(ETA, { halo, speeds: { unit: 'km/s', values: GRID }, ...over });

const scenario = (halo: Json): Json => ({
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-38 cm^2', mediator: 'heavy' },
  halo,
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 6 },
});
const ratesOf = (halo: Json): Promise<RatesAnswer> => answered<RatesAnswer>('/v1/rates', scenario(halo));

/** Largest difference of two η, as a share of η(0). */
function largestDifference(a: Eta, b: Eta): number {
  const [x, y] = [a.meanInverseSpeed.values, b.meanInverseSpeed.values];
  expect(x).toHaveLength(GRID.length);
  return Math.max(...x.map((value, i) => Math.abs(value - y[i]) / y[0]));
}

const velocity = (...values: number[]): Json => ({ unit: 'km/s', values });

describe('POST /v1/halo/mean-inverse-speed with a date', () => {
  // from a general-purpose astronomy library's built-in ephemeris, with the default circular and peculiar velocity; 0.1 km/s
  const TABLE = [
    ['2026-03-21', 256.68],
    ['2026-06-02', 266.19],
    ['2026-09-23', 247.56],
    ['2026-12-02', 237.2],
  ] as const;

  it.each(TABLE)('%s: the laboratory moves at %d km/s within 0.1', async (date, speed) => {
    const dated = await etaOf({ date });
    expect(Math.abs(dated.laboratorySpeed!.value - speed)).toBeLessThan(0.1);
    expect(dated.largestSpeed.value).toBeCloseTo(544 + dated.laboratorySpeed!.value, 9);
    const given = await etaOf({ laboratorySpeed: { value: dated.laboratorySpeed!.value, unit: 'km/s' } });
    expect(given.meanInverseSpeed).toEqual(dated.meanInverseSpeed);
    expect(given).not.toHaveProperty('laboratorySpeed');
  });

  it('takes a date as 00:00 UTC, and a time with its zone', async () => {
    const bare = await etaOf({ date: '2027-06-02' });
    for (const date of ['2027-06-02T00:00:00Z', '2027-06-02T02:00:00+02:00'])
      expect(await etaOf({ date })).toEqual(bare);
    expect(await etaOf({ date: '2027-06-02T12:00:00Z' })).not.toEqual(bare);
  });

  it('adds the peculiar velocity, as one list or three quantities; without a date it is the Sun’s way', async () => {
    const [list, three] = await Promise.all([
      etaOf({ date: '2026-06-02', peculiarVelocity: velocity(11.1, 12.2, 7.3) }),
      etaOf({ date: '2026-06-02', peculiarVelocity: ['11100 m/s', '12.2 km/s', { value: 7.3, unit: 'km/s' }] }),
    ]);
    expect(three).toEqual(list);
    expect(list).toEqual(await etaOf({ date: '2026-06-02' }));
    const sun = await etaOf({ peculiarVelocity: velocity(11.1, 12.2, 7.3) });
    expect(sun.laboratorySpeed!.value).toBeCloseTo(Math.hypot(11.1, 250.2, 7.3), 10);
  });
});

describe('POST /v1/rates, /v1/reach and /v1/trade-offs with a date', () => {
  it('answer as with the speed of that date; the halo is told', async () => {
    const dated = await ratesOf({ date: '2026-12-02' });
    const laboratorySpeed = dated.halo!.laboratorySpeed!;
    expect(Math.abs(laboratorySpeed.value - 237.2)).toBeLessThan(0.1);
    expect(dated.halo).toMatchObject({ localDensity: { value: 0.3 }, largestSpeed: { unit: 'km/s' } });
    const given = await ratesOf({ laboratorySpeed });
    expect(given.bins).toEqual(dated.bins);
    expect(given).not.toHaveProperty('halo');

    const goal = { kind: 'exclusion', confidence: 0.9 };
    const reach = (halo: Json): Promise<ReachAnswer> => {
      const { darkMatter: _, ...rest } = scenario(halo);
      const body = { scenario: { ...rest, darkMatter: { mediator: 'heavy' }, goal }, exposure: '1 kg yr' };
      return answered<ReachAnswer>('/v1/reach', { ...body, masses: { unit: 'MeV', values: [2, 20] } });
    };
    const [a, b] = await Promise.all([reach({ date: '2026-12-02' }), reach({ laboratorySpeed })]);
    expect(a.points).toEqual(b.points);
    expect(a.lightestMass).toEqual(b.lightestMass);

    const choices = async (halo: Json) =>
      (await answered<TradeOffsAnswer>('/v1/trade-offs', { scenario: { ...scenario(halo), goal }, windowFrom: [1, 2] }))
        .choices;
    expect(await choices({ date: '2026-12-02' })).toEqual(await choices({ laboratorySpeed }));
  });

  it('hash the same whether defaults are written or not, and differently with a date', async () => {
    const hash = async (halo: Json) => (await ratesOf(halo)).provenance.request.sha256;
    const bare = await hash({});
    expect(await hash({ model: 'standard', cutoff: 'sharp', laboratorySpeed: '250 km/s' })).toBe(bare);
    expect(await hash({ date: '2026-06-02' })).not.toBe(bare);
    expect(await hash({ date: '2026-06-02' })).toBe(await hash({ date: '2026-06-02T00:00Z' }));
  });
});

describe('POST /v1/halo/mean-inverse-speed with a model', () => {
  const MAXWELL = { dispersion: { value: 238 / Math.SQRT2, unit: 'km/s' } };
  const components = (...list: Json[]): Json => ({ model: 'components', components: list });

  it('components: one at rest is the standard model within 1e-6, at a speed and on a date; so is a sum of them', async () => {
    for (const met of [{}, { laboratorySpeed: '300 km/s' }, { date: '2026-06-02' }]) {
      const standard = await etaOf(met);
      expect(largestDifference(await etaOf({ ...met, ...components(MAXWELL) }), standard)).toBeLessThan(1e-6);
      const three = components(...[1, 2, 3].map((weight) => ({ ...MAXWELL, weight })));
      expect(largestDifference(await etaOf({ ...met, ...three }), standard)).toBeLessThan(1e-6);
    }
    expect(
      largestDifference(await etaOf({ escapeSpeed: '500 km/s', ...components(MAXWELL) }), await etaOf({})),
    ).toBeGreaterThan(1e-4);
  });

  it('components: in POST /v1/rates too, within 1e-5', async () => {
    const [sum, standard] = await Promise.all([ratesOf(components(MAXWELL)), ratesOf({})]);
    sum.bins.forEach(({ rate }, i) => {
      expect(Math.abs(rate.value - standard.bins[i].rate.value)).toBeLessThanOrEqual(
        1e-5 * standard.bins[i].rate.value,
      );
    });
    expect(sum.halo!.largestSpeed.value).toBeCloseTo(794, 9);
  });

  it('components: equal axes are the isotropic one within 1e-5', async () => {
    const mean = { meanVelocity: velocity(0, 100, 0) };
    const axes = components({ dispersion: velocity(150, 150, 150), ...mean });
    expect(
      largestDifference(await etaOf(axes), await etaOf(components({ dispersion: '150 km/s', ...mean }))),
    ).toBeLessThan(1e-5);
  });

  it('components: a cold stream is a step at its speed in the laboratory, seen to move with the date', async () => {
    const stream = (date: string) =>
      etaOf({ date, ...components({ dispersion: '0 km/s', meanVelocity: velocity(0, -200, 0) }) });
    const [june, december] = await Promise.all([stream('2026-06-02'), stream('2026-12-02')]);
    // (11.1, 450.2, 7.3) and the Earth's (8.17, 14.77, −24.03), (−8.74, −15.17, 24.61)
    const speeds = [Math.hypot(19.27, 464.97, -16.73), Math.hypot(2.36, 435.03, 31.91)];
    [june, december].forEach(({ meanInverseSpeed, largestSpeed, meanSpeed }, i) => {
      expect(Math.abs(largestSpeed.value - speeds[i])).toBeLessThan(0.05);
      expect(meanSpeed.value).toBeCloseTo(largestSpeed.value, 6);
      meanInverseSpeed.values.forEach((eta, k) => {
        expect(eta).toBe(GRID[k] < largestSpeed.value ? 1 / largestSpeed.value : 0);
      });
    });
  });

  const TABLE_SPEEDS = Array.from({ length: 2000 }, (_, i) => (544 * i) / 1999);
  const maxwell = TABLE_SPEEDS.map((v) => v * v * Math.exp(-((v / 238) ** 2)));
  const tabulated = (kind: string, values: unknown, speeds: unknown = TABLE_SPEEDS): Json => ({
    model: 'tabulated',
    tabulated: { kind, speeds: { unit: 'km/s', values: speeds }, values },
  });

  it('tabulated: the standard halo in 2,000 points comes back to 1e-5, its integral told', async () => {
    const table = await etaOf(tabulated('galactic', maxwell));
    expect(largestDifference(table, await etaOf({}))).toBeLessThan(1e-5);
    const sum = maxwell.reduce((total, value) => total + value, 0) * (544 / 1999);
    expect(table.normalisation! / (sum - (maxwell[1999] * 544) / 3998)).toBeCloseTo(1, 9);
    expect(table.localDensity).toEqual({ value: 0.3, unit: 'GeV/cm^3' });
  });

  it('tabulated: what this service answers goes in again, f(v) and η(v), within 2e-4', async () => {
    const fine = Array.from({ length: 1589 }, (_, i) => i / 2);
    const standard = await etaOf({}, { speeds: { unit: 'km/s', values: fine }, speedDistribution: true });
    const reference = await etaOf({});
    const again = tabulated('laboratory', standard.speedDistribution!.values, fine);
    expect(largestDifference(await etaOf(again), reference)).toBeLessThan(2e-4);
    const eta = await etaOf(tabulated('meanInverseSpeed', standard.meanInverseSpeed.values, fine));
    expect(largestDifference(eta, reference)).toBeLessThan(2e-4);
    expect(eta.normalisation).toBeCloseTo(1, 4);
    expect(eta.meanSpeed.value).toBeCloseTo(353.731, 1); // 2∫vη dv, (238, 250, 544)
  });

  it('speedDistribution: integrates to 1 for every model', async () => {
    const width = 0.5;
    const middles = Array.from({ length: 2000 }, (_, i) => width * (i + 0.5));
    const models = [
      {},
      { cutoff: 'smooth', date: '2027-06-02' },
      components(
        { dispersion: velocity(200, 100, 120) },
        { weight: 0.2, dispersion: '30 km/s', meanVelocity: velocity(0, -200, 0) },
      ),
      tabulated('galactic', maxwell),
      tabulated('laboratory', [0, 2, 3, 0], [0, 100, 300, 600]),
    ];
    for (const halo of models) {
      const body = { speeds: { unit: 'km/s', values: middles }, speedDistribution: true };
      const { speedDistribution } = await etaOf(halo, body);
      expect(speedDistribution!.unit).toBe('s/km');
      expect(speedDistribution!.values.reduce((sum, f) => sum + f * width, 0)).toBeCloseTo(1, 3);
    }
  });

  it('answers with the same bytes again', async () => {
    const body = { halo: components({ dispersion: velocity(200, 100, 120) }), speeds: { unit: 'km/s', values: GRID } };
    const [a, b] = [await app.post(ETA, body), await app.post(ETA, body)];
    expect(await a.text()).toBe(await b.text());
  });
});

describe('halo, refused', () => {
  const CASES: [string, Json, string[]][] = [
    ['date and speed', { date: '2027-01-01', laboratorySpeed: '250 km/s' }, ['']],
    ['no date', { date: 'tomorrow' }, ['/date']],
    ['a day that is none', { date: '2027-02-30' }, ['/date']],
    ['a time without zone', { date: '2027-02-03T10:00:00' }, ['/date']],
    ['a year before', { date: '1949-12-31' }, ['/date']],
    ['a year after', { date: '2101-01-01' }, ['/date']],
    [
      'a bare number',
      { peculiarVelocity: [1, 2, 3] },
      ['/peculiarVelocity/0', '/peculiarVelocity/1', '/peculiarVelocity/2'],
    ],
    ['two components', { peculiarVelocity: velocity(1, 2) }, ['/peculiarVelocity/values']],
    ['a velocity above c', { peculiarVelocity: { unit: 'c', values: [1, 1, 0] } }, ['/peculiarVelocity']],
    ['no such model', { model: 'lumpy' }, ['/model']],
    ['components without a list', { model: 'components' }, ['/components']],
    ['an empty list', { model: 'components', components: [] }, ['/components']],
    ['a list without the model', { components: [{ dispersion: '1 km/s' }] }, ['/components']],
    [
      'a cutoff of components',
      { model: 'components', components: [{ dispersion: '1 km/s' }], cutoff: 'sharp' },
      ['/cutoff'],
    ],
    [
      'components out of their domain',
      { model: 'components', components: [{ dispersion: '-1 km/s', weight: 0 }, { dispersion: '2 c' }, {}] },
      ['/components/0/weight', '/components/0/dispersion', '/components/2/dispersion'],
    ],
    [
      'a dispersion above c',
      { model: 'components', components: [{ dispersion: '1 km/s' }, { dispersion: '2 c' }] },
      ['/components/1/dispersion'],
    ],
    [
      'axes too unlike',
      { model: 'components', components: [{ dispersion: velocity(100, 1, 100) }] },
      ['/components/0/dispersion'],
    ],
    [
      'a negative axis',
      { model: 'components', components: [{ dispersion: velocity(100, -100, 100) }] },
      ['/components/0/dispersion'],
    ],
    [
      'a mean beyond escape',
      { model: 'components', components: [{ dispersion: '9 km/s', meanVelocity: velocity(0, 0, 545) }] },
      ['/components/0/meanVelocity'],
    ],
    [
      'a speed above c in the laboratory',
      { model: 'components', escapeSpeed: '0.9 c', laboratorySpeed: '0.2 c', components: [{ dispersion: '0.3 c' }] },
      ['/components'],
    ],
    [
      'a table without the model',
      { tabulated: { kind: 'galactic', speeds: velocity(0, 1), values: [0, 1] } },
      ['/tabulated'],
    ],
    [
      'a table of no kind',
      { model: 'tabulated', tabulated: { speeds: velocity(0, 1), values: [0, 1] } },
      ['/tabulated/kind'],
    ],
  ];
  const table = (kind: string, speeds: unknown[], values: unknown[], over: Json = {}): Json => ({
    model: 'tabulated',
    tabulated: { kind, speeds: { unit: 'km/s', values: speeds }, values },
    ...over,
  });
  const TABLES: [string, Json, string[]][] = [
    ['negative values', table('galactic', [0, 1, 2], [0, -1, -2]), ['/tabulated/values/1', '/tabulated/values/2']],
    ['speeds that do not rise', table('galactic', [0, 2, 2], [0, 1, 2]), ['/tabulated/speeds/values/2']],
    ['a speed above c', table('laboratory', [0, 1, 3e5], [0, 1, 2]), ['/tabulated/speeds/values/2']],
    ['above c in the laboratory', table('galactic', [0, 1, 299_700], [0, 1, 2]), ['/tabulated']],
    ['another number of values', table('galactic', [0, 1, 2], [0, 1]), ['/tabulated/values']],
    ['nothing at all', table('laboratory', [0, 1, 2], [0, 0, 0]), ['/tabulated/values']],
    ['an infinite ⟨1/v⟩', table('laboratory', [0, 1, 2], [1, 1, 0]), ['/tabulated/values/0']],
    ['η that rises', table('meanInverseSpeed', [0, 1, 2], [2, 1, 1.5]), ['/tabulated/values/2']],
    ['an escape speed', table('galactic', [0, 1], [0, 1], { escapeSpeed: '1 km/s' }), ['/escapeSpeed']],
    [
      'a laboratory that moves through its own frame',
      table('laboratory', [0, 1], [0, 1], { date: '2027-01-01', circularSpeed: '1 km/s' }),
      ['/circularSpeed', '/date'],
    ],
  ];
  it.each([...CASES, ...TABLES])('POST /v1/rates and /v1/halo/mean-inverse-speed: %s', async (_, halo, pointers) => {
    const at = pointers.map((pointer) => `/halo${pointer}`);
    expect(await pointersOf(await app.post('/v1/rates', scenario(halo)))).toEqual(at);
    expect(await pointersOf(await app.post(ETA, { halo, speeds: { unit: 'km/s', values: [1] } }))).toEqual(at);
  });
});
