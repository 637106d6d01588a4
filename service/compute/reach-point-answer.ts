/** One mass of a reach: an independent piece of work, run in a worker thread. */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { lightestMassMev, lowestFeedingEnergyEv } from '../../physics/reach/mass-grid.ts';
import { type ReachPoint, reachPoints } from '../../physics/reach/reach-point.ts';
import type { GoalIn } from '../schemas/goal.ts';
import { ionizationModelOf, measuredBackgrounds, measuredSignal, readoutOf } from './detector-view.ts';
import { windowOf, windowRates } from './exposure-answer.ts';

import { kept } from './kept.ts';
import { type NoticeOut, rateNotices } from './notices.ts';
import { rateOf } from './rates-answer.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';
import { largestSpeedKmPerS } from './velocity-distributions.ts';

export interface ReachPointJob {
  /** Its mass is the point's, its cross section a reference that drops out. */
  readonly scenario: ResolvedScenario;
  readonly table: CrystalTable;
  readonly goal: GoalIn;
  readonly exposureKgYr: number;
}

export interface ReachPointAnswer extends ReachPoint {
  readonly massMev: number;
  readonly notices: readonly NoticeOut[];
}

/** Rates are computed for this σ̄ₑ, cm²: of the order that makes them ordinary numbers. */
export const REFERENCE_CROSS_SECTION_CM2 = 1e-38;

export function reachPointAnswer(job: ReachPointJob): ReachPointAnswer {
  const { scenario, goal } = job;
  const search = searchOf(job);
  const response = readoutOf(scenario);
  const rate = rateOf(job, response.lastElectron);
  const { from, to } = windowOf(goal, scenario.ionization.maxElectrons);
  const counted = measuredSignal(rate, response).slice(from, to + 1);
  // at the edge itself rounding decides whether a rate is 0: it is not reached
  const lightest = lightestMass(scenario, job.table, goal);
  const reached = lightest !== undefined && scenario.darkMatter.massMev > lightest;
  const point = search({
    crossSectionCm2: REFERENCE_CROSS_SECTION_CM2,
    ratesPerKgYr: counted.map(({ value }) => (reached ? value : 0)),
    relativeErrors: counted.map(({ relativeError }) => relativeError),
  });
  return { ...point, massMev: scenario.darkMatter.massMev, notices: rateNotices(scenario, rate) };
}

type Search = ReturnType<typeof reachPoints>;

const MOST_SEARCHES = 16;
const searches = new Map<string, Search>(); // least recently used first

/** The search is the same for every mass of a curve, and its mean upper limit can take a tenth of a second: kept by the thread. */
function searchOf({ scenario, goal, exposureKgYr }: ReachPointJob): Search {
  const { ionization, readout, backgrounds } = scenario;
  const key = JSON.stringify([ionization, readout, backgrounds, goal, exposureKgYr]);
  return kept(searches, MOST_SEARCHES, key, () => newSearch(scenario, goal, exposureKgYr));
}

function newSearch(scenario: ResolvedScenario, goal: GoalIn, exposureKgYr: number): Search {
  const response = readoutOf(scenario);
  const all = measuredBackgrounds(scenario, ionizationModelOf(scenario.ionization), response);
  const { backgrounds } = windowRates([], all, windowOf(goal, scenario.ionization.maxElectrons));
  return reachPoints({ goal, exposureKgYr, backgrounds });
}

/** The exact mass, MeV, above which the window is fed at all; undefined where the table ends below the energy that feeds it. */
export function lightestMass(scenario: ResolvedScenario, table: CrystalTable, goal: GoalIn): number | undefined {
  const energy = lowestEnergy(scenario, table, goal);
  if (energy === undefined) return undefined;
  const vMax = largestSpeedKmPerS(scenario.halo);
  return lightestMassMev(energy, scenario.darkMatter.massSplittingEv, vMax);
}

/** The lowest energy, eV, of which something can be measured in the window. */
function lowestEnergy(
  { ionization, readout }: ResolvedScenario,
  table: CrystalTable,
  goal: GoalIn,
): number | undefined {
  const { bandGapEv, energyPerPairEv, model } = ionization;
  // noise carries any charge into the window
  const from = (readout?.noiseElectrons ?? 0) > 0 ? 1 : (goal.window?.from ?? 1);
  const inTable = (energyEv: number): number | undefined => {
    const lowest = Math.max(energyEv, table.energyEv[0]);
    return lowest < table.energyEv[table.energyEv.length - 1] ? lowest : undefined;
  };
  if (model === 'step') return lowestFeedingEnergyEv(table.energyEv, bandGapEv, energyPerPairEv, from);
  if (model === 'fano') return inTable(from * bandGapEv); // n pairs cost n gaps
  const { energiesEv = [], probabilities = [] } = ionization.table ?? {};
  const feeds = probabilities.findIndex((row) => row.some((p, i) => i + 1 >= from && p > 0));
  return feeds < 0 ? undefined : inTable(Math.max(bandGapEv, energiesEv[Math.max(0, feeds - 1)]));
}
