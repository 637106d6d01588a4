/** What is told of a halo beside what was asked for. */
import { meanSpeedKmPerS } from '../../physics/halo/mean-speed.ts';
import { type HaloIn, isMoving } from '../schemas/halo.ts';
import type { HaloOut } from '../schemas/halo-answer.ts';
import { haloOf } from './halos.ts';

/** Mean and largest speed in the laboratory, the local density, and the laboratory's speed where it moves through the halo. */
export function haloFacts(halo: HaloIn): HaloOut {
  const distribution = haloOf(halo);
  return {
    localDensity: { value: halo.localDensityGevPerCm3, unit: 'GeV/cm^3' },
    ...(isMoving(halo) ? { laboratorySpeed: { value: halo.laboratorySpeedKmPerS, unit: 'km/s' } } : {}),
    meanSpeed: { value: meanSpeedKmPerS(distribution), unit: 'km/s' },
    largestSpeed: { value: distribution.largestSpeedKmPerS, unit: 'km/s' },
  };
}
