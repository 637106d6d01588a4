/** Numbers of every size that a double can hold, in every place of a request: an answer or a refusal, never nonsense. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const SEED = 20_270_602;
const RUNS = 300;

const sized = (least: number, most: number): fc.Arbitrary<number> =>
  fc
    .tuple(fc.integer({ min: 1000, max: 9999 }), fc.integer({ min: least, max: most }))
    .map(([digits, exponent]) => Number(`${digits / 1000}e${exponent}`));
const anySize = sized(-300, 300);
/** Speeds end at that of light. */
const anySpeed = sized(-300, 5).filter((v) => v < 299_792);

/** Where an answer holds what none may: a negative number, or null (once not finite) where the schema has no null. */
function oddIn(value: unknown, place = ''): string[] {
  if (value === null) return /^\/exposure\/(?:needed|expected\w+|binding)$/.test(place) ? [] : [place];
  if (typeof value === 'number') return value >= 0 ? [] : [`${place} = ${value}`];
  if (typeof value !== 'object') return [];
  return Object.entries(value).flatMap(([key, inner]) => oddIn(inner, `${place}/${key}`));
}

async function check(path: string, body: unknown): Promise<number> {
  const response = await app.post(path, body);
  const text = await response.text();
  expect([200, 422], text).toContain(response.status);
  expect(text).not.toMatch(/NaN|Infinity/);
  if (response.status === 200) {
    expect(oddIn(JSON.parse(text))).toEqual([]);
  } else {
    const { errors } = JSON.parse(text) as { errors: unknown[] };
    expect(errors.length).toBeGreaterThan(0);
  }
  return response.status;
}

const scenarios = (size: fc.Arbitrary<number>, speed: fc.Arbitrary<number>) =>
  fc
    .record({
      mass: size,
      section: size,
      mediator: fc.oneof(
        fc.constantFrom('heavy', 'light'),
        size.map((m) => ({ mass: `${m} keV` })),
      ),
      splitting: fc.oneof(
        fc.constant(0),
        size,
        size.map((x) => -x),
      ),
      density: size,
      speeds: fc.tuple(speed, speed, speed),
      cutoff: fc.constantFrom('sharp', 'smooth'),
      kind: fc.constantFrom('edges', 'points'),
      quantity: fc.constantFrom('formFactorSquared', 'lossFunction'),
      cell: fc.tuple(size, size),
      axes: fc.tuple(size, size, size, size),
      value: size,
      gap: size,
      pair: fc.integer({ min: 0, max: 1000 }),
      goal: fc.oneof(
        size.map((n) => ({ kind: 'events', count: Math.min(n, 1e12) })),
        fc
          .tuple(sized(0, 5), sized(-300, -1))
          .map(([n, p]) => ({ kind: 'detection', atLeast: Math.ceil(n), probability: p })),
        sized(-300, -1).map((confidence) => ({ kind: 'exclusion', confidence })),
      ),
    })
    .map((x) => {
      const count = x.kind === 'edges' ? 3 : 2;
      return {
        darkMatter: {
          mass: `${x.mass} MeV`,
          referenceCrossSection: `${x.section} cm^2`,
          mediator: x.mediator,
          massSplitting: `${x.splitting} eV`,
        },
        halo: {
          localDensity: `${x.density} GeV/cm^3`,
          circularSpeed: `${x.speeds[0]} km/s`,
          escapeSpeed: `${x.speeds[1]} km/s`,
          laboratorySpeed: `${x.speeds[2]} km/s`,
          cutoff: x.cutoff,
        },
        crystal: {
          name: 'Invented numbers',
          cellMass: `${x.cell[0]} GeV`,
          cellVolume: `${x.cell[1]} angstrom^3`,
          momentum: { unit: 'keV', [x.kind]: { start: x.axes[0], step: x.axes[1], count } },
          energy: { unit: 'eV', [x.kind]: { start: x.axes[2], step: x.axes[3], count } },
          [x.quantity]: [
            [x.value, 0],
            [x.value / 3, x.value],
          ],
        },
        ionization: { bandGap: `${x.gap} eV`, energyPerPair: `${x.gap * (1 + x.pair / 100)} eV`, maxElectrons: 5 },
        spectrum: true,
        goal: x.goal,
      };
    });

describe('extreme numbers', () => {
  test.each<[string, fc.Arbitrary<unknown>, number]>([
    ['of any size everywhere', scenarios(anySize, anySpeed), 1],
    ['of six orders of magnitude', scenarios(sized(-3, 3), sized(0, 4)), RUNS / 2],
  ])('POST /v1/rates: numbers %s', async (_what, arbitrary, leastAnswered) => {
    let answered = 0;
    const property = fc.asyncProperty(arbitrary, async (body) => {
      if ((await check('/v1/rates', body)) === 200) answered++;
    });
    await fc.assert(property, { seed: SEED, numRuns: RUNS });
    expect(answered).toBeGreaterThanOrEqual(leastAnswered);
  });

  const usual = {
    darkMatter: {
      mass: '10 MeV',
      referenceCrossSection: '1e-37 cm^2',
      mediator: { mass: '30 keV' },
      massSplitting: '0 eV',
    },
    halo: {
      localDensity: '0.3 GeV/cm^3',
      circularSpeed: '238 km/s',
      escapeSpeed: '544 km/s',
      laboratorySpeed: '250 km/s',
    },
    crystal: {
      name: 'Invented numbers',
      cellMass: '52 GeV',
      cellVolume: '40 angstrom^3',
      momentum: { unit: 'keV', edges: [1, 2, 4] },
      energy: { unit: 'eV', edges: [0.5, 5, 10] },
      formFactorSquared: [
        [0.1, 0.2],
        [0.3, 0.1],
      ],
    },
    ionization: { bandGap: '1.1 eV', energyPerPair: '3.8 eV' },
    spectrum: true,
    goal: { kind: 'events', count: 3 },
  };
  const text = JSON.stringify(usual);
  test.each([
    '"10 MeV"',
    '"1e-37 cm^2"',
    '"30 keV"',
    '"0 eV"',
    '"0.3 GeV/cm^3"',
    '"238 km/s"',
    '"544 km/s"',
    '"250 km/s"',
    '"52 GeV"',
    '"40 angstrom^3"',
    '"1.1 eV"',
    '"3.8 eV"',
    '[1,2,4]',
    '[0.5,5,10]',
    '[0.1,0.2]',
    '"count":3',
  ])('POST /v1/rates: %s replaced by numbers of every size', async (place) => {
    expect(text).toContain(place);
    const statuses = new Set<number>();
    for (let exponent = -320; exponent <= 308; exponent += 4) {
      const changed = place.replace(/^(.*?)[\d.]+(?:e-?\d+)?( [^,]*|[\]]|)$/, `$11.7e${exponent}$2`);
      expect(changed).not.toBe(place);
      statuses.add(await check('/v1/rates', text.replace(place, changed)));
    }
    expect(statuses).toContain(200);
  });

  test('POST /v1/rates: a tiny energy per pair makes steps beyond count, none of which matter', async () => {
    for (const tiny of ['1e-5 eV', '1e-12 eV', '1e-250 eV']) {
      const ionization = { bandGap: tiny, energyPerPair: tiny, maxElectrons: 100 };
      expect(await check('/v1/rates', { ...usual, ionization })).toBe(200);
    }
  });

  test('POST /v1/halo/mean-inverse-speed: speeds of any size', async () => {
    let answered = 0;
    const property = fc.asyncProperty(
      fc.tuple(anySpeed, anySpeed, anySpeed, anySize, fc.constantFrom('sharp', 'smooth')),
      async ([circular, escapeSpeed, laboratory, v, cutoff]) => {
        const halo = {
          circularSpeed: `${circular} km/s`,
          escapeSpeed: `${escapeSpeed} km/s`,
          laboratorySpeed: `${laboratory} km/s`,
          cutoff,
        };
        const values = [0, v, laboratory, escapeSpeed, escapeSpeed + laboratory, Math.abs(escapeSpeed - laboratory)];
        const body = { halo, speeds: { unit: 'km/s', values } };
        if ((await check('/v1/halo/mean-inverse-speed', body)) === 200) answered++;
      },
    );
    await fc.assert(property, { seed: SEED, numRuns: 2 * RUNS });
    expect(answered).toBeGreaterThan(RUNS);
  });
});
