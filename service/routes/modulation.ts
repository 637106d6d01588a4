import { daysOfYear } from '../../physics/modulation/modulation.ts';
import type { ResolvedScenario } from '../compute/resolved-scenario.ts';
import { provenanceOf } from '../provenance.ts';
import { resolveScenario } from '../resolve-scenario.ts';
import { defineRoute, negotiate } from '../route.ts';
import { isMoving } from '../schemas/halo.ts';
import { ModulationAnswer, type ModulationIn } from '../schemas/modulation.ts';

const scenario = {
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-38 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 6 },
};

export const modulation = defineRoute({
  method: 'post',
  path: '/v1/modulation',
  operationId: 'computeModulation',
  tag: 'rates',
  summary: 'Rates by date, and the exposure at which their modulation is seen',
  description:
    'Each bin’s rate on every day of a year or on a list of dates, as the Earth goes around the Sun: mean, amplitude and the day of the ' +
    'maximum; and the exposure at which the annual modulation stands out of the scenario’s backgrounds. A planning estimate.',
  body: 'modulation',
  examples: {
    year: {
      summary: 'A year in silicon, over a flat background, from two electrons up',
      value: {
        scenario: {
          ...scenario,
          backgrounds: [{ name: 'gammas', kind: 'flat', rate: '1000 1/(kg yr keV)' }],
          goal: { kind: 'discovery', significance: 3, window: { from: 2, to: 6 } },
        },
        year: 2027,
      },
    },
    dates: {
      summary: 'Four dates and another rotation of the Sun',
      value: {
        scenario: {
          ...scenario,
          halo: { circularSpeed: '220 km/s', peculiarVelocity: ['10 km/s', '11 km/s', '7 km/s'] },
        },
        dates: ['2027-03-21', '2027-06-02T12:00:00Z', '2027-09-23', '2027-12-02'],
        significance: 5,
      },
    },
  },
  responses: { 200: { description: 'Rates by date.', schema: ModulationAnswer } },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies, signal }) {
    negotiate(c, ['application/json']);
    const { crystals, compute, version } = dependencies;
    const { scenario, table } = await resolveScenario(body.scenario, dependencies, '/scenario');
    const id = scenario.crystal.id;
    const began = performance.now();
    const { dates, ...instants } = instantsOf(body);
    const job = { scenario, table, ...instants, significance: body.significance, at: '/scenario' };
    const answer = await crystals.using(id, () => compute.run('modulation', job, { signal }));
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    return c.json({ dates, ...answer, provenance: provenanceOf(canonical(body, scenario), id, version) });
  },
});

/** Instants in a year of a list of dates, for the annual amplitude: five days apart. */
const IN_A_YEAR = 73;

/** What the dates are called, and the instants that are meant: 00:00 UTC of a date without time. */
function instantsOf({ year, dates }: ModulationIn) {
  if (year !== undefined) {
    const days = daysOfYear(year);
    return { dates: days.map((ms) => new Date(ms).toISOString().slice(0, 10)), instantsMs: days, yearMs: undefined };
  }
  const given = dates ?? [];
  const instantsMs = given.map((date) => Date.parse(date));
  const first = new Date(instantsMs[0]).getUTCFullYear();
  const [from, to] = [Date.UTC(first, 0, 1), Date.UTC(first + 1, 0, 1)];
  const yearMs = Array.from({ length: IN_A_YEAR }, (_, i) => from + ((to - from) * i) / IN_A_YEAR);
  return { dates: given, instantsMs, yearMs };
}

/** The request as it was understood: without the laboratory's speed, which the dates set. */
function canonical({ year, dates, significance }: ModulationIn, scenario: ResolvedScenario) {
  const { halo } = scenario;
  const undated = isMoving(halo)
    ? { ...halo, laboratorySpeedKmPerS: undefined, laboratoryVelocityKmPerS: undefined }
    : halo;
  return { scenario: { ...scenario, halo: undated }, year, dates, significance };
}
