/**
 * A reach curve: its masses as independent jobs on the worker pool, a few at a time so that interactive calls get their turn in
 * between, its points in the order of the masses.
 */
import { bestPoint } from '../physics/reach/mass-grid.ts';

import type { NoticeOut } from './compute/notices.ts';
import { lightestMass, REFERENCE_CROSS_SECTION_CM2, type ReachPointAnswer } from './compute/reach-point-answer.ts';
import type { ResolvedScenario } from './compute/resolved-scenario.ts';
import { largestSpeedKmPerS } from './compute/velocity-distributions.ts';
import { provenanceOf } from './provenance.ts';
import { resolveScenario, type ScenarioToCompute } from './resolve-scenario.ts';
import type { Dependencies } from './route.ts';
import type { ReachIn, ReachPointOut, ReachSummary } from './schemas/reach.ts';

export interface ReachCurve {
  /** In the order of the masses, each as soon as it and all before it are there. */
  readonly points: AsyncIterable<ReachPointOut>;
  /** What goes with the points; once they have all been taken. */
  summary(): ReachSummary;
}

/** Resolves the request and starts on it. `at` is where in the body it stands. */
export async function reachCurve(
  input: ReachIn,
  dependencies: Dependencies,
  signal: AbortSignal,
  at = '',
): Promise<ReachCurve> {
  const { scenario, exposureKgYr, massesMev } = input;
  const { crystals, ...rest } = scenario;
  const tables = await Promise.all(
    crystals.map((crystal, i) =>
      resolveScenario(
        {
          ...rest,
          crystal,
          darkMatter: {
            ...scenario.darkMatter,
            massMev: massesMev[0],
            referenceCrossSectionCm2: REFERENCE_CROSS_SECTION_CM2,
          },
        },
        dependencies,
        `${at}/scenario`,
        crystals.length > 1 ? `/crystal/${i}` : '/crystal',
      ),
    ),
  );
  const collected: { answers: ReachPointAnswer[]; points: ReachPointOut[] } = { answers: [], points: [] };
  const ids = tables.map((table) => table.scenario.crystal.id);

  async function* points(): AsyncGenerator<ReachPointOut> {
    for await (const answers of inOrder(massesMev, tables, exposureKgYr, dependencies, signal)) {
      const point = pointOut(answers, ids);
      collected.answers.push(answers[0]);
      collected.points.push(point);
      yield point;
    }
  }
  return {
    points: points(),
    summary: () => summaryOf(input, tables, collected, dependencies.version),
  };
}

/** Answers of every table, mass by mass; a bounded number of jobs is under way. */
async function* inOrder(
  massesMev: readonly number[],
  tables: readonly ScenarioToCompute[],
  exposureKgYr: number,
  { compute, crystals }: Dependencies,
  signal: AbortSignal,
): AsyncGenerator<ReachPointAnswer[]> {
  const one = ({ scenario, table }: ScenarioToCompute, massMev: number): Promise<ReachPointAnswer> => {
    const job = {
      scenario: { ...scenario, darkMatter: { ...scenario.darkMatter, massMev } },
      table,
      goal: scenario.goal!,
      exposureKgYr,
    };
    return crystals.using(scenario.crystal.id, () => compute.run('reachPoint', job, { signal }));
  };
  const start = (massMev: number): Promise<ReachPointAnswer[]> => {
    const answers = Promise.all(tables.map((table) => one(table, massMev)));
    answers.catch(() => {}); // awaited in its turn; until then a failure is nobody's
    return answers;
  };
  const ahead = Math.max(1, Math.ceil((2 * compute.workers) / tables.length));
  const running: Promise<ReachPointAnswer[]>[] = [];
  let next = 0;
  while (next < massesMev.length || running.length > 0) {
    while (next < massesMev.length && running.length < ahead) running.push(start(massesMev[next++]));
    yield await running.shift()!;
  }
}

function pointOut(answers: readonly ReachPointAnswer[], ids: readonly string[]): ReachPointOut {
  const [{ massMev, crossSectionCm2, relativeError, expectedSignal, expectedBackground, binding }] = answers;
  return {
    mass: { value: massMev, unit: 'MeV' },
    crossSection: crossSectionCm2 === null ? null : { value: crossSectionCm2, unit: 'cm^2', relativeError },
    expectedSignal,
    expectedBackground,
    binding,
    ...(answers.length > 1 ? { band: bandOf(answers, ids) } : {}),
  };
}

function bandOf(answers: readonly ReachPointAnswer[], ids: readonly string[]): NonNullable<ReachPointOut['band']> {
  const sorted = answers
    .map(({ crossSectionCm2 }, i) => ({ value: crossSectionCm2 ?? Number.POSITIVE_INFINITY, id: ids[i] }))
    .sort((a, b) => a.value - b.value);
  const [lowest, highest] = [sorted[0], sorted[sorted.length - 1]];
  const out = (value: number) => (value < Infinity ? { value, unit: 'cm^2' as const } : null);
  return {
    lowest: out(lowest.value),
    highest: out(highest.value),
    lowestCrystal: lowest.value < Infinity ? lowest.id : null,
    highestCrystal: highest.id,
  };
}

function summaryOf(
  input: ReachIn,
  tables: readonly ScenarioToCompute[],
  { answers, points }: { readonly answers: readonly ReachPointAnswer[]; readonly points: readonly ReachPointOut[] },
  version: string,
): ReachSummary {
  const [{ scenario, table }] = tables;
  const goal = scenario.goal!;
  const lightest = lightestMass(scenario, table, goal);
  const best = bestPoint(
    points.map((point) => ({ massMev: point.mass.value, crossSectionCm2: point.crossSection?.value ?? null })),
  );
  const request = canonicalRequest(input, tables);
  return {
    lightestMass: lightest === undefined ? null : { value: lightest, unit: 'MeV' },
    best:
      best?.crossSectionCm2 == null
        ? null
        : { mass: { value: best.massMev, unit: 'MeV' }, crossSection: { value: best.crossSectionCm2, unit: 'cm^2' } },
    request,
    notices: noticesOf(answers, points, lightest, scenario),
    provenance: provenanceOf(request, scenario.crystal.id, version),
  };
}

/** The request as it was understood, for the hash and for comparisons. */
function canonicalRequest(
  { exposureKgYr, massesMev }: ReachIn,
  tables: readonly ScenarioToCompute[],
): Record<string, unknown> {
  const [{ scenario }] = tables;
  const { darkMatter, crystal: _crystal, payload: _payload, spectrum: _spectrum, ...rest } = scenario;
  const { mediator, massSplittingEv } = darkMatter;
  const request = {
    scenario: { ...rest, darkMatter: { mediator, massSplittingEv }, crystals: tables.map((t) => t.scenario.crystal) },
    exposureKgYr,
    massesMev,
  };
  return JSON.parse(JSON.stringify(request)) as Record<string, unknown>; // as it will be read back: without undefined
}

/** What holds for the curve: notices of one mass only where they hold for it too, range cuts with the masses they concern. */
function noticesOf(
  answers: readonly ReachPointAnswer[],
  points: readonly ReachPointOut[],
  lightest: number | undefined,
  scenario: ResolvedScenario,
): NoticeOut[] {
  const byCode = new Map<string, { first: number; last: number; detail: string }>();
  for (const { massMev, notices } of answers) {
    for (const { code, detail } of notices) {
      if (code === 'unreachable-bins') continue;
      byCode.set(code, { first: byCode.get(code)?.first ?? massMev, last: massMev, detail });
    }
  }
  const notices = [...byCode].map(([code, { first, last, detail }]) =>
    code.endsWith('-range-cut')
      ? { code, detail: `From ${first} MeV on; at ${last} MeV: ${detail}` }
      : { code, detail },
  );
  const unreached = points.filter(({ crossSection }) => crossSection === null).length;
  if (unreached > 0) {
    const vMax = largestSpeedKmPerS(scenario.halo);
    const edge =
      lightest === undefined
        ? 'the table ends below the energy that feeds the window'
        : `nothing up to ${lightest} MeV feeds the window (v_max ${vMax} km/s)`;
    notices.push({
      code: 'unreached-masses',
      detail: `${unreached} of ${points.length} masses are not reached: ${edge}; just above that, a table may still hold nothing that the halo can excite.`,
    });
  }
  return notices;
}
