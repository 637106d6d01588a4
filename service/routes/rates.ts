import { provenanceOf } from '../provenance.ts';
import { resolveScenario } from '../resolve-scenario.ts';
import { defineRoute, negotiate } from '../route.ts';
import { RatesAnswer } from '../schemas/rates.ts';

const scenario = {
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-37 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 12 },
};

export const rates = defineRoute({
  method: 'post',
  path: '/v1/rates',
  operationId: 'computeRates',
  tag: 'rates',
  summary: 'Rates per ionization bin, and the exposure a goal needs',
  description:
    'Events per exposure in each electron bin for a scenario; with a goal, the exposure that reaches it; with "spectrum": true, dR/dE; ' +
    'with "response": true, what any other halo would give; with "uncertainty", quantiles over uncertain parameters. ' +
    'A planning estimate: the collaboration’s own analysis takes precedence.',
  body: 'rates',
  examples: {
    rates: { summary: 'Rates in silicon, everything else by default', value: scenario },
    detection: {
      summary: 'Exposure for three events or more with 90 % probability, from two electrons up',
      value: {
        ...scenario,
        darkMatter: { ...scenario.darkMatter, mediator: { mass: '30 keV' } },
        goal: { kind: 'detection', atLeast: 3, probability: 0.9, window: { from: 2, to: 6 } },
      },
    },
    uncertainty: {
      summary: 'What an uncertain halo does to the exposure',
      value: {
        ...scenario,
        goal: { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 12 } },
        uncertainty: {
          draws: 500,
          seed: 7,
          parameters: {
            circularSpeed: '1.5 km/s',
            escapeSpeed: '35 km/s',
            localDensity: '0.05 GeV/cm^3',
            energyPerPair: '0.1 eV',
          },
        },
      },
    },
    response: {
      summary: 'On a date, and the response to any halo',
      value: {
        ...scenario,
        halo: { date: '2027-06-02' },
        ionization: { maxElectrons: 3 },
        response: true,
      },
    },
    inlineTable: {
      summary: 'A table of one’s own, inline, and the spectrum',
      value: {
        darkMatter: { mass: '50 MeV', referenceCrossSection: '1e-39 cm^2', mediator: 'light', massSplitting: '0.5 eV' },
        halo: { laboratorySpeed: '265 km/s', cutoff: 'smooth' },
        crystal: {
          name: 'Invented numbers',
          cellMass: { formula: 'Si2' },
          bandGap: '1.1 eV',
          energyPerPair: '3.7 eV',
          momentum: { unit: 'keV', edges: [1, 3, 6, 12] },
          energy: { unit: 'eV', edges: { start: 0, step: 5, count: 4 } },
          formFactorSquared: [
            [0.01, 0.2, 0.02],
            [0.02, 0.3, 0.1],
            [0.01, 0.1, 0.2],
          ],
        },
        spectrum: true,
      },
    },
  },
  responses: { 200: { description: 'Rates, and the exposure if there is a goal.', schema: RatesAnswer } },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies, signal }) {
    negotiate(c, ['application/json']);
    const { crystals, compute, version } = dependencies;
    const { scenario, table } = await resolveScenario(body.scenario, dependencies);
    const extras = {
      ...(body.response ? { response: true as const } : {}),
      ...(body.uncertainty ? { uncertainty: body.uncertainty } : {}),
    };
    const id = scenario.crystal.id;
    const began = performance.now();
    const answer = await crystals.using(id, () => compute.run('rates', { scenario, table, ...extras }, { signal }));
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    return c.json({ ...answer, provenance: provenanceOf({ ...scenario, ...extras }, id, version) });
  },
});
