/** Velocities in the galactic frame: U towards the centre, V with the rotation, W towards the north pole; km/s. */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import { DomainError } from '../errors.ts';

export type GalacticVelocity = readonly [u: number, v: number, w: number];

/** |v|, km/s. */
export function speedOf(velocity: GalacticVelocity): number {
  return Math.hypot(...velocity);
}

/** a + b. */
export function velocitySum(a: GalacticVelocity, b: GalacticVelocity): GalacticVelocity {
  return [a[0] + b[0], a[1] + b[1], a[2] + b[2]];
}

/** a − b. */
export function velocityDifference(a: GalacticVelocity, b: GalacticVelocity): GalacticVelocity {
  return [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
}

/** Refuses a velocity that is not finite or not below the speed of light. */
export function requireVelocity(parameter: string | readonly (string | number)[], velocity: GalacticVelocity): void {
  if (!(speedOf(velocity) < SPEED_OF_LIGHT_KM_PER_S))
    throw new DomainError(parameter, velocity, 'three finite components, together below the speed of light');
}
