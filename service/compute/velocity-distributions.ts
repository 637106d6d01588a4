/** A halo as it came in, as the velocity distribution that the calculation takes. */
import { componentsHalo, largestSpeedOfComponentsKmPerS } from '../../physics/halo/components.ts';
import { type GalacticVelocity, speedOf, velocitySum } from '../../physics/halo/galactic-velocity.ts';
import { standardHalo } from '../../physics/halo/standard-halo.ts';
import {
  type TabulatedHalo,
  tabulatedGalacticHalo,
  tabulatedLaboratoryHalo,
  tabulatedMeanInverseSpeed,
} from '../../physics/halo/tabulated.ts';
import type { VelocityDistribution } from '../../physics/halo/velocity-distribution.ts';
import type { HaloShape } from '../../physics/rate/response.ts';
import {
  type GalacticTableHaloIn,
  type HaloIn,
  isMoving,
  type LaboratoryTableHaloIn,
  type MovingHaloIn,
  velocityAlongSun,
} from '../schemas/halo.ts';

export function distributionOf(halo: HaloIn): VelocityDistribution {
  switch (halo.model) {
    case undefined:
      return standardHalo(halo);
    case 'components':
      return componentsHalo(halo.components, halo.laboratoryVelocityKmPerS);
    case 'tabulated':
      return tabulatedDistribution(halo);
  }
}

export function tabulatedDistribution(halo: GalacticTableHaloIn | LaboratoryTableHaloIn): TabulatedHalo {
  switch (halo.kind) {
    case 'galactic':
      return tabulatedGalacticHalo(halo, halo.laboratorySpeedKmPerS);
    case 'laboratory':
      return tabulatedLaboratoryHalo(halo);
    case 'meanInverseSpeed':
      return tabulatedMeanInverseSpeed(halo);
  }
}

/** The largest speed in the laboratory, km/s; of components without their integrals, so that it costs microseconds. */
export function largestSpeedKmPerS(halo: HaloIn): number {
  return halo.model === 'components'
    ? largestSpeedOfComponentsKmPerS(halo.components, halo.laboratoryVelocityKmPerS)
    : distributionOf(halo).largestSpeedKmPerS;
}

/** A component narrower than this, km/s, makes η fall in a step. */
const NARROW_KM_PER_S = 5;

/** How finely a response must be made for a halo of this model. */
export function shapeOf(halo: HaloIn): HaloShape {
  switch (halo.model) {
    case undefined:
      return 'smooth';
    case 'components':
      return halo.components.some(({ dispersionKmPerS }) => smallestOf(dispersionKmPerS) < NARROW_KM_PER_S)
        ? 'steps'
        : 'smooth';
    case 'tabulated':
      return halo.values[halo.values.length - 1] > 0 ? 'steps' : 'smooth';
  }
}

function smallestOf(dispersion: number | GalacticVelocity): number {
  return typeof dispersion === 'number' ? dispersion : Math.min(...dispersion);
}

/** The same halo met at another velocity of the laboratory, km/s. */
export function atVelocity<H extends MovingHaloIn>(halo: H, velocity: GalacticVelocity): H {
  return { ...halo, laboratorySpeedKmPerS: speedOf(velocity), laboratoryVelocityKmPerS: velocity };
}

/**
 * The same halo after the circular speed has changed to another, km/s: it is also the Sun's rotation, so that the
 * laboratory's velocity gains the difference along it, whether a date set it or its length was given.
 */
export function withCircularSpeed<H extends MovingHaloIn>(halo: H, circularSpeedKmPerS: number): H {
  const { laboratorySpeedKmPerS: speed, circularSpeedKmPerS: before } = halo;
  const velocity = halo.laboratoryVelocityKmPerS ?? velocityAlongSun(speed, before);
  const shifted = velocitySum(velocity, [0, circularSpeedKmPerS - before, 0]);
  return { ...atVelocity(halo, shifted), circularSpeedKmPerS };
}

/** The same halo met at another speed of the laboratory, km/s, along its velocity. */
export function withLaboratorySpeed<H extends MovingHaloIn>(halo: H, speedKmPerS: number): H {
  const before = halo.laboratoryVelocityKmPerS ?? velocityAlongSun(1, halo.circularSpeedKmPerS);
  const length = speedOf(before);
  const [u, v, w] = length > 0 ? before : [0, 1, 0];
  const share = speedKmPerS / (length > 0 ? length : 1);
  return atVelocity(halo, [share * u, share * v, share * w]);
}

/** Whether the halo's own numbers are worth telling: it is not the standard model at a given speed. */
export function isBeyondDefault(halo: HaloIn): boolean {
  return halo.model !== undefined || (isMoving(halo) && halo.laboratoryVelocityKmPerS !== undefined);
}
