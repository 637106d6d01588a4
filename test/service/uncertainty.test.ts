/** POST /v1/rates with `uncertainty`. */
import { describe, expect, it } from 'vitest';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import { changedAt, inventedScenario, type Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const scenario: Json = {
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-38 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 5 },
};
const goal = { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 5 } };

async function answered(body: Json): Promise<RatesAnswer> {
  const response = await app.post('/v1/rates', body);
  const text = await response.text();
  expect(response.status, text.slice(0, 400)).toBe(200);
  expect(text).not.toMatch(/NaN|Infinity/);
  return JSON.parse(text) as RatesAnswer;
}
const drawn = async (uncertainty: Json, over: Json = {}) => {
  const answer = await answered({ ...scenario, ...over, uncertainty });
  return { ...answer, uncertainty: answer.uncertainty! };
};
const MEDIAN = 2;

describe('POST /v1/rates with uncertainty', () => {
  it('of the density alone: the Gaussian’s own quantiles, the exposure’s inverse', async () => {
    const { uncertainty, bins, total, exposure } = await drawn(
      { draws: 4000, seed: 7, parameters: { localDensity: '0.03 GeV/cm^3' } },
      { goal },
    );
    expect(uncertainty).toMatchObject({ draws: 4000, seed: 7, redrawn: 0, quantiles: [0.05, 0.16, 0.5, 0.84, 0.95] });
    // standard errors √(p(1 − p)/n)/φ(z) of the quantiles of a Gaussian, of 10 %: 4 of them
    const z = [-1.64485, -0.99446, 0, 0.99446, 1.64485];
    z.forEach((deviations, i) => {
      const p = uncertainty.quantiles[i];
      const density = Math.exp((-deviations * deviations) / 2) / Math.sqrt(2 * Math.PI);
      const error = (4 * 0.1 * Math.sqrt((p * (1 - p)) / 4000)) / density;
      const factor = 1 + 0.1 * deviations;
      expect(Math.abs(uncertainty.total.rate.values[i] / total.value - factor)).toBeLessThan(error);
      uncertainty.bins.forEach(({ rate }, bin) => {
        expect(Math.abs(rate.values[i] / bins[bin].rate.value - factor)).toBeLessThan(error);
      });
      // S X = limit: the exposure's quantile is the inverse of the density's from the other end
      const other = uncertainty.total.rate.values[4 - i] / total.value;
      expect((uncertainty.exposure!.needed.values[i]! * other) / exposure!.needed!.value).toBeCloseTo(1, 3);
    });
    expect(uncertainty.total.varianceShares).toMatchObject({ localDensity: expect.closeTo(1, 6) });
  });

  it('of the circular speed: the rate’s derivative along the way that takes the laboratory with it', async () => {
    const { uncertainty } = await drawn({ draws: 2000, seed: 1, parameters: { circularSpeed: '1.5 km/s' } });
    const at = async (v0: number) => {
      // v_E is taken along the Sun's (11.1, 250.2, 7.3), and gains what v₀ gains
      const share = 250 / Math.hypot(11.1, 250.2, 7.3);
      const speed = Math.hypot(share * 11.1, share * 250.2 + (v0 - 238), share * 7.3);
      const halo = { circularSpeed: `${v0} km/s`, laboratorySpeed: `${speed} km/s` };
      return (await answered({ ...scenario, halo })).total.value;
    };
    const slope = ((await at(239.5)) - (await at(236.5))) / 3;
    const [, low, , high] = uncertainty.total.rate.values;
    // 16 to 84 % is 1.989 σ; the width of 2,000 draws is known to 2.5 %
    expect(Math.abs((high - low) / (1.98892 * 1.5 * slope) - 1)).toBeLessThan(4 * 0.025);
  });

  it('of a circular speed on a date: the same as drawing about the velocity of that date', async () => {
    const parameters = { circularSpeed: '3 km/s' };
    const dated = await drawn({ draws: 300, parameters }, { halo: { date: '2027-06-02' } });
    const { value } = dated.halo!.laboratorySpeed!;
    const given = await drawn({ draws: 300, parameters }, { halo: { laboratorySpeed: `${value} km/s` } });
    // the Earth's way bends the direction a little
    dated.uncertainty.total.rate.values.forEach((rate, i) => {
      expect(rate / given.uncertainty.total.rate.values[i]).toBeCloseTo(1, 3);
    });
  });

  it('of gap and pair energy: the median is the rate itself, the 16 to 84 % width that of the derivative', async () => {
    const { uncertainty, bins } = await drawn({ draws: 2000, seed: 3, parameters: { energyPerPair: '0.05 eV' } });
    const at = (energyPerPair: string) => answered({ ...scenario, ionization: { maxElectrons: 5, energyPerPair } });
    const central = Number((bins[0].energy.to - bins[0].energy.from).toPrecision(12));
    const [less, more] = await Promise.all([at(`${central - 0.05} eV`), at(`${central + 0.05} eV`)]);
    let compared = 0;
    for (const bin of [1, 2, 3, 4]) {
      const [, low, median, high] = uncertainty.bins[bin].rate.values;
      expect(Math.abs(median / bins[bin].rate.value - 1)).toBeLessThan(4e-3); // the ladder's 2e-3 and the draws'
      const slope = Math.abs(more.bins[bin].rate.value - less.bins[bin].rate.value) / 0.1;
      if (slope * 0.05 < 0.01 * bins[bin].rate.value) continue;
      expect(Math.abs((high - low) / (1.98892 * 0.05 * slope) - 1)).toBeLessThan(0.15);
      compared++;
    }
    expect(compared).toBeGreaterThanOrEqual(2);
  });

  it('of several: shares of the variance sum to 1, the density’s the largest; independent of the order of the keys', async () => {
    const a = { circularSpeed: '1.5 km/s', escapeSpeed: '35 km/s', localDensity: '0.05 GeV/cm^3' };
    const b = { localDensity: '0.05 GeV/cm^3', escapeSpeed: '35 km/s', circularSpeed: '1500 m/s' };
    const [one, two] = [
      await drawn({ seed: 7, parameters: a }, { goal }),
      await drawn({ seed: 7, parameters: b }, { goal }),
    ];
    expect(two).toEqual(one);
    for (const { varianceShares } of [one.uncertainty.total, one.uncertainty.exposure!, ...one.uncertainty.bins]) {
      const { unexplained, ...shares } = varianceShares!;
      const sum = Object.values(shares).reduce<number>((total, share) => total + (share ?? 0), 0);
      expect(sum + unexplained).toBeCloseTo(1, 9);
      expect(shares.localDensity!).toBeGreaterThan(Math.max(shares.circularSpeed!, shares.escapeSpeed!));
    }
  });

  it('with a covariance: a diagonal one is the parameters’, in any units', async () => {
    const parameters = await drawn({
      draws: 200,
      seed: 2,
      parameters: { circularSpeed: '2 km/s', localDensity: '0.02 GeV/cm^3' },
    });
    const covariance = {
      parameters: ['circularSpeed', 'localDensity'],
      units: ['m/s', 'GeV/cm^3'],
      values: [
        [4e6, 0],
        [0, 4e-4],
      ],
    };
    const matrix = await drawn({ draws: 200, seed: 2, covariance });
    matrix.uncertainty.total.rate.values.forEach((rate, i) => {
      expect(rate / parameters.uncertainty.total.rate.values[i]).toBeCloseTo(1, 12);
    });
  });

  it('redraws what is unphysical and counts it: half of the densities about 0.1 ± 10', async () => {
    const { uncertainty } = await drawn(
      { draws: 1000, seed: 4, parameters: { localDensity: '10 GeV/cm^3' } },
      { halo: { localDensity: '0.1 GeV/cm^3' } },
    );
    expect(Math.abs(uncertainty.redrawn - 1000)).toBeLessThan(4 * Math.sqrt(2000)); // negative binomial
    expect(uncertainty.total.rate.values[0]).toBeGreaterThan(0);
  });

  it('works with readout, backgrounds and every goal; exposures out of reach are null and counted', async () => {
    const over = {
      readout: { noise: 0.15, efficiency: 0.9 },
      backgrounds: [
        { name: 'gammas', kind: 'flat', rate: '1000 1/(kg yr keV)' },
        {
          name: 'dark current',
          kind: 'darkCurrent',
          current: '1e-4 1/day',
          pixelMass: '0.35 ug',
          readoutInterval: '1 day',
        },
      ],
    };
    const parameters = { circularSpeed: '1.5 km/s', bandGap: '0.02 eV' };
    for (const kind of [
      { kind: 'events', count: 3 },
      { kind: 'detection', atLeast: 3, probability: 0.9 },
      { kind: 'exclusion', confidence: 0.9 },
      { kind: 'exclusion', confidence: 0.9, method: 'likelihood' },
      { kind: 'discovery', significance: 3 },
    ]) {
      const one = { ...over, goal: { ...kind, window: { from: 2, to: 5 } } };
      const { uncertainty, exposure } = await drawn({ draws: 60, parameters }, one);
      expect(uncertainty.exposure!.unreached).toBe(0);
      expect(uncertainty.exposure!.needed.values[MEDIAN]! / exposure!.needed!.value).toBeCloseTo(1, 1);
    }
    // the threshold of three electrons lies where only some of the halos reach
    const edge = await drawn(
      { draws: 100, parameters: { escapeSpeed: '50 km/s' } },
      {
        darkMatter: { mass: '2.48 MeV', referenceCrossSection: '1e-38 cm^2', mediator: 'heavy' },
        goal: { ...goal, window: { from: 3, to: 5 } },
      },
    );
    const { needed, unreached, varianceShares } = edge.uncertainty.exposure!;
    expect(unreached).toBeGreaterThan(0);
    expect(unreached).toBeLessThan(100);
    expect(needed.values[4]).toBeNull();
    expect(varianceShares).toBeNull();
  });

  it('works with components, a table in the galaxy and one in the laboratory', async () => {
    const speeds = { unit: 'km/s', values: [0, 100, 200, 300, 400, 544] };
    const values = [0, 0.8, 2, 2.1, 0.9, 0];
    const halos: [Json, Json][] = [
      [
        { model: 'components', components: [{ dispersion: '168 km/s' }] },
        { circularSpeed: '3 km/s', laboratorySpeed: '2 km/s' },
      ],
      [{ model: 'tabulated', tabulated: { kind: 'galactic', speeds, values } }, { circularSpeed: '3 km/s' }],
      [{ model: 'tabulated', tabulated: { kind: 'laboratory', speeds, values } }, { localDensity: '0.05 GeV/cm^3' }],
    ];
    for (const [halo, parameters] of halos) {
      const { uncertainty, total } = await drawn({ draws: 100, parameters }, { halo });
      const { values: rates } = uncertainty.total.rate;
      expect(rates[MEDIAN] / total.value).toBeCloseTo(1, 1);
      expect(rates[4]).toBeGreaterThan(rates[0]);
    }
  });

  it('answers with the same bytes again, others for another seed, and leaves the rest of the answer alone', async () => {
    const uncertainty = { draws: 100, seed: 1, parameters: { escapeSpeed: '35 km/s' } };
    const text = async (of: Json) => (await app.post('/v1/rates', { ...scenario, uncertainty: of })).text();
    expect(await text(uncertainty)).toBe(await text(uncertainty));
    expect(await text({ ...uncertainty, seed: 2 })).not.toBe(await text(uncertainty));
    const { uncertainty: _, provenance, ...rest } = await answered({ ...scenario, uncertainty });
    const { provenance: bare, ...plain } = await answered(scenario);
    expect(rest).toEqual(plain);
    expect(provenance.request.sha256).not.toBe(bare.request.sha256);
  });

  const table = { kind: 'laboratory', speeds: { unit: 'km/s', values: [0, 300, 600] }, values: [0, 1, 0] };
  const two = (values: unknown, over: Json = {}): Json => ({
    covariance: { parameters: ['circularSpeed', 'escapeSpeed'], units: ['km/s', 'km/s'], values, ...over },
  });
  it.each<[string, Json, string[], Json?]>([
    ['nothing', {}, ['']],
    ['no parameter', { parameters: {} }, ['/parameters']],
    [
      'both',
      {
        parameters: { bandGap: '0.1 eV' },
        ...two([
          [1, 0],
          [0, 1],
        ]),
      },
      [''],
    ],
    ['too many draws', { draws: 10_001, parameters: { bandGap: '0.1 eV' } }, ['/draws']],
    ['a seed below 0', { seed: -1, parameters: { bandGap: '0.1 eV' } }, ['/seed']],
    [
      'a deviation of 0, a bare one, an unknown one',
      { parameters: { bandGap: '0 eV', escapeSpeed: 35, mass: '1 MeV' } },
      ['/parameters/mass', '/parameters/escapeSpeed', '/parameters/bandGap'],
    ],
    [
      'an indefinite covariance',
      two([
        [1, 2],
        [2, 1],
      ]),
      ['/covariance/values'],
    ],
    [
      'an asymmetric one',
      two([
        [4, 1],
        [2, 4],
      ]),
      ['/covariance/values'],
    ],
    ['one row too few', two([[4, 1]]), ['/covariance/values']],
    [
      'a unit that is none of it',
      two(
        [
          [4, 0],
          [0, 4],
        ],
        { units: ['km/s', 'eV'] },
      ),
      ['/covariance/units/1'],
    ],
    [
      'one unit too few',
      two(
        [
          [4, 0],
          [0, 4],
        ],
        { units: ['km/s'] },
      ),
      ['/covariance/units'],
    ],
    [
      'a parameter twice',
      two(
        [
          [4, 0],
          [0, 4],
        ],
        { parameters: ['bandGap', 'bandGap'], units: ['eV', 'eV'] },
      ),
      ['/covariance/parameters/1'],
    ],
    [
      'a speed of a table in the laboratory',
      { parameters: { circularSpeed: '1 km/s', escapeSpeed: '1 km/s', localDensity: '0.1 GeV/cm^3' } },
      ['/parameters/circularSpeed', '/parameters/escapeSpeed'],
      { halo: { model: 'tabulated', tabulated: table } },
    ],
    [
      'what is hardly ever physical',
      { parameters: { energyPerPair: '1e6 eV', bandGap: '1e9 eV' } },
      [''],
      { ionization: { bandGap: '1 eV', energyPerPair: '1 eV' } },
    ],
  ])('POST /v1/rates, %s: told where', async (_, uncertainty, pointers, over = {}) => {
    const response = await app.post('/v1/rates', { ...scenario, ...over, uncertainty });
    expect([...(await pointersOf(response))].sort()).toEqual(pointers.map((at) => `/uncertainty${at}`).sort());
  });

  it('is refused for a table of charges, with another fault of the scenario beside it', async () => {
    const table = { energies: { unit: 'eV', values: [1.12, 50] }, probabilities: [[1], [1]] };
    const body = inventedScenario({ ionization: { model: 'table', table } });
    const response = await app.post('/v1/rates', { ...body, uncertainty: { parameters: { bandGap: '0.1 eV' } } });
    expect(await pointersOf(response)).toEqual(['/uncertainty/parameters/bandGap']);
    const mass = changedAt({ ...scenario, uncertainty: { draws: 0, parameters: {} } }, '/darkMatter/mass', 3);
    expect(await pointersOf(await app.post('/v1/rates', mass))).toEqual(['/darkMatter/mass', '/uncertainty/draws']);
  });
});
