/** A scenario without its halo, as the calculation takes it. */
import { SPEED_OF_LIGHT_KM_PER_S } from '../../physics/constants.ts';
import type { ResponseScenario } from '../../physics/rate/response.ts';
import { Problem } from '../problem.ts';
import { ionizationModelOf } from './detector-view.ts';
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

/** A response needs a largest speed below that of light; `at` is where in the body the scenario stands. */
export function requireBelowLight(largestSpeedKmPerS: number, at: string): void {
  if (largestSpeedKmPerS < SPEED_OF_LIGHT_KM_PER_S) return;
  throw new Problem('invalid-input', 'The request has 1 fault.', [
    { pointer: `${at}/halo`, detail: 'must have a largest speed in the laboratory below the speed of light' },
  ]);
}
