import { type Fault, invalidInput, Problem } from '../problem.ts';
import { provenanceOf } from '../provenance.ts';
import { resolveScenario, type ScenarioToCompute, unknownCrystal } from '../resolve-scenario.ts';
import { type Dependencies, defineRoute, negotiate } from '../route.ts';
import { CrystalComparisonAnswer, type CrystalComparisonIn } from '../schemas/crystal-comparisons.ts';
import type { ScenarioIn } from '../schemas/scenario.ts';
import { unknownTable } from './crystals.ts';

const scenario = { darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-37 cm^2', mediator: 'heavy' } };

export const crystalComparisons = defineRoute({
  method: 'post',
  path: '/v1/crystals/{id}/comparisons',
  operationId: 'compareCrystals',
  tag: 'crystals',
  summary: 'Two tables under one scenario: rates bin by bin, and where they differ',
  description:
    'The table of the URL is the baseline, the other the candidate. The plane of momentum and energy is cut into blocks that add up to ' +
    'the rates: the answer lists those that make the difference, the largest first.',
  parameters: { id: 'SHA-256 of the baseline, or the alias of a built-in one.' },
  parameterExamples: { id: 'silicon' },
  body: 'crystalComparison',
  examples: {
    screening: {
      summary: 'What in-medium screening does to silicon',
      value: { other: 'silicon-unscreened', scenario: { ...scenario, ionization: { maxElectrons: 10 } } },
    },
    twin: {
      summary: 'The screened table that comes with the service, and the screened twin of the unscreened one',
      value: { other: 'silicon-unscreened', scenario: { ...scenario, screening: 'in-medium' } },
    },
  },
  responses: { 200: { description: 'The comparison.', schema: CrystalComparisonAnswer } },
  problems: ['malformed-body', 'not-found', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies, signal }) {
    negotiate(c, ['application/json']);
    const { crystals, compute, version } = dependencies;
    const name = c.req.param('id')!;
    if (!(await crystals.find(name))) throw unknownTable(name);
    const { baseline, candidate, otherBandGapEv } = await bothSides(name, body, dependencies);
    const job = {
      scenario: baseline.scenario,
      baseline: baseline.table,
      otherCrystal: candidate.scenario.crystal,
      candidate: candidate.table,
      otherBandGapEv,
    };
    const began = performance.now();
    const answer = await crystals.using(job.scenario.crystal.id, () =>
      crystals.using(job.otherCrystal.id, () => compute.run('tableComparison', job, { signal })),
    );
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    const request = { scenario: job.scenario, other: job.otherCrystal };
    return c.json({ ...answer, provenance: provenanceOf(request, job.scenario.crystal.id, version) });
  },
});

/** Both tables found, with the gap and pair energy that hold for both; every fault at once. */
async function bothSides(
  name: string,
  { other, scenario: compared }: CrystalComparisonIn,
  dependencies: Dependencies,
): Promise<{ baseline: ScenarioToCompute; candidate: ScenarioToCompute; otherBandGapEv: number | undefined }> {
  const rest = { readout: undefined, backgrounds: [], goal: undefined, payload: undefined, spectrum: false };
  const input: ScenarioIn = { ...compared, crystal: { id: name }, ...rest };
  const record = await dependencies.crystals.find(other);
  const unknown = record ? [] : [unknownCrystal('/other', other)];
  const baseline = await toldFrom({ parameter: 'id' }, unknown, resolveScenario(input, dependencies, '/scenario'));
  if (!record) throw invalidInput(unknown);
  const { bandGapEv, energyPerPairEv } = baseline.scenario.ionization;
  const same = { ...input, crystal: { id: other }, ionization: { ...compared.ionization, bandGapEv, energyPerPairEv } };
  const candidate = await toldFrom({ pointer: '/other' }, [], resolveScenario(same, dependencies, '/scenario'));
  return { baseline, candidate, otherBandGapEv: record.header.bandGapEv };
}

/** What is wrong with a table is told where the table is named: the scenario of a comparison has none. */
async function toldFrom<T>(place: Omit<Fault, 'detail'>, others: readonly Fault[], resolving: Promise<T>): Promise<T> {
  try {
    return await resolving;
  } catch (error) {
    if (!(error instanceof Problem) || error.type !== 'invalid-input') throw error;
    const faults = error.faults.map((fault) =>
      fault.pointer?.startsWith('/scenario/crystal/') ? { ...place, detail: fault.detail } : fault,
    );
    throw invalidInput([...others, ...faults]);
  }
}
