/** A scenario with its uncertain parameters at other values. */
import { SPEED_OF_LIGHT_KM_PER_S } from '../../physics/constants.ts';
import { DomainError } from '../../physics/errors.ts';
import { largestSpeedOfComponentsKmPerS } from '../../physics/halo/components.ts';
import { type HaloIn, isMoving } from '../schemas/halo.ts';
import type { ParameterName } from '../schemas/uncertainty.ts';
import type { ResolvedIonization, ResolvedScenario } from './resolved-scenario.ts';
import { withCircularSpeed, withLaboratorySpeed } from './velocity-distributions.ts';

/** A parameter's value in a scenario, in its fixed unit. */
export function parameterValue(name: ParameterName, { halo, ionization }: ResolvedScenario): number {
  switch (name) {
    case 'localDensity':
      return halo.localDensityGevPerCm3;
    case 'energyPerPair':
      return ionization.energyPerPairEv;
    case 'bandGap':
      return ionization.bandGapEv;
    case 'escapeSpeed':
      return halo.model === undefined ? halo.escapeSpeedKmPerS : Number.NaN;
    case 'circularSpeed':
      return isMoving(halo) ? halo.circularSpeedKmPerS : Number.NaN;
    case 'laboratorySpeed':
      return isMoving(halo) ? halo.laboratorySpeedKmPerS : Number.NaN;
  }
}

/** The scenario with these values; a circular speed takes the laboratory with it, after its own speed was set. */
export function drawnScenario(
  scenario: ResolvedScenario,
  names: readonly ParameterName[],
  values: readonly number[],
): ResolvedScenario {
  const drawn = new Map(names.map((name, i) => [name, values[i]]));
  let { halo, ionization } = scenario;
  const { localDensity, escapeSpeed, laboratorySpeed, circularSpeed, bandGap, energyPerPair } = Object.fromEntries(
    drawn,
  ) as Partial<Record<ParameterName, number>>;
  if (localDensity !== undefined) halo = { ...halo, localDensityGevPerCm3: localDensity };
  if (escapeSpeed !== undefined && halo.model === undefined) halo = { ...halo, escapeSpeedKmPerS: escapeSpeed };
  if (laboratorySpeed !== undefined && isMoving(halo)) halo = withLaboratorySpeed(halo, laboratorySpeed);
  if (circularSpeed !== undefined && isMoving(halo)) halo = withCircularSpeed(halo, circularSpeed);
  if (bandGap !== undefined) ionization = { ...ionization, bandGapEv: bandGap };
  if (energyPerPair !== undefined) ionization = { ...ionization, energyPerPairEv: energyPerPair };
  return { ...scenario, halo, ionization };
}

/** No halo of the scenario is faster in the laboratory, km/s; cheap. */
export function speedBoundKmPerS(halo: HaloIn): number {
  switch (halo.model) {
    case undefined:
      return halo.escapeSpeedKmPerS + halo.laboratorySpeedKmPerS;
    case 'components':
      return largestSpeedOfComponentsKmPerS(halo.components, halo.laboratoryVelocityKmPerS);
    case 'tabulated':
      return halo.speedsKmPerS[halo.speedsKmPerS.length - 1] + (isMoving(halo) ? halo.laboratorySpeedKmPerS : 0);
  }
}

/** Whether a scenario can be: every parameter within its domain, the gap not above the pair energy, nothing as fast as light. */
export function isPhysical(
  scenario: ResolvedScenario,
  names: readonly ParameterName[],
  values: readonly number[],
): boolean {
  const inDomain = names.every((name, i) => values[i] > 0 || (values[i] === 0 && MAY_VANISH.has(name)));
  if (!inDomain) return false;
  const { halo, ionization, darkMatter } = drawnScenario(scenario, names, values);
  return isPossible(halo) && isConsistent(ionization, darkMatter.massSplittingEv);
}

const MAY_VANISH: ReadonlySet<ParameterName> = new Set(['laboratorySpeed', 'bandGap']);

function isPossible(halo: HaloIn): boolean {
  try {
    return speedBoundKmPerS(halo) < SPEED_OF_LIGHT_KM_PER_S && largestGivenKmPerS(halo) < SPEED_OF_LIGHT_KM_PER_S;
  } catch (error) {
    if (!(error instanceof DomainError)) throw error;
    return false;
  }
}

function largestGivenKmPerS(halo: HaloIn): number {
  return isMoving(halo) ? Math.max(halo.circularSpeedKmPerS, halo.laboratorySpeedKmPerS) : 0;
}

function isConsistent({ bandGapEv, energyPerPairEv }: ResolvedIonization, splittingEv: number): boolean {
  return energyPerPairEv >= bandGapEv && (splittingEv >= 0 || splittingEv > -bandGapEv);
}
