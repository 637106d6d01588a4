/** A scenario without its halo, as the calculation takes it. */
import { SPEED_OF_LIGHT_KM_PER_S } from '../../physics/constants.ts';
import { type Response, type ResponseScenario, response } from '../../physics/rate/response.ts';
import { Problem } from '../problem.ts';
import { ionizationModelOf } from './detector-view.ts';
import { kept } from './kept.ts';
import { keptTable } from './kept-tables.ts';
import type { RatesJob } from './rates-answer.ts';

export function responseScenarioOf({ scenario, table }: RatesJob, lastElectron: number): ResponseScenario {
  const { darkMatter, halo, ionization } = scenario;
  return {
    massEv: darkMatter.massMev * 1e6,
    crossSectionCm2: darkMatter.referenceCrossSectionCm2,
    mediator: darkMatter.mediator,
    splittingEv: darkMatter.massSplittingEv,
    localDensityGevPerCm3: halo.localDensityGevPerCm3,
    table: keptTable(scenario.crystal, table),
    ionization: ionizationModelOf(ionization),
    energyPerPairEv: ionization.energyPerPairEv,
    maxElectrons: lastElectron,
  };
}

/** A megabyte each, at most. */
const MOST_RESPONSES = 16;
const responses = new Map<string, Response>();

/** The response of a job's scenario to any halo up to a largest speed, km/s; every halo of every later job reuses it. */
export function responseOf(
  job: RatesJob,
  lastElectron: number,
  largestSpeedKmPerS: number,
  shape: Parameters<typeof response>[2],
): Response {
  const { darkMatter, halo, crystal, ionization } = job.scenario;
  const density = halo.localDensityGevPerCm3;
  const key = JSON.stringify([darkMatter, density, crystal, ionization, lastElectron, largestSpeedKmPerS, shape]);
  const make = (): Response => response(responseScenarioOf(job, lastElectron), largestSpeedKmPerS, shape);
  return kept(responses, MOST_RESPONSES, key, make);
}

/** A response needs a largest speed below that of light; `at` is where in the body the scenario stands. */
export function requireBelowLight(largestSpeedKmPerS: number, at: string): void {
  if (largestSpeedKmPerS < SPEED_OF_LIGHT_KM_PER_S) return;
  throw new Problem('invalid-input', 'The request has 1 fault.', [
    { pointer: `${at}/halo`, detail: 'must have a largest speed in the laboratory below the speed of light' },
  ]);
}
