/** The answer of POST /v1/halo/mean-inverse-speed: runs in a worker thread. */
import { meanSpeedKmPerS } from '../../physics/halo/mean-speed.ts';
import { Problem } from '../problem.ts';
import type { HaloIn } from '../schemas/halo.ts';
import { haloOf } from './halos.ts';

export interface MeanInverseSpeedJob {
  readonly halo: HaloIn;
  readonly speedsKmPerS: readonly number[];
}

export function meanInverseSpeedAnswer({ halo, speedsKmPerS }: MeanInverseSpeedJob) {
  const distribution = haloOf(halo);
  const values = speedsKmPerS.map((v) => distribution.meanInverseSpeed(v));
  const meanSpeed = meanSpeedKmPerS(distribution);
  if (![...values, meanSpeed].every((value) => value >= 0 && value < Infinity)) {
    const detail = 'the speeds are so small, or so unlike each other, that the numbers cannot be represented';
    throw new Problem('invalid-input', 'The request has 1 fault.', [{ pointer: '/halo', detail }]);
  }
  return {
    meanInverseSpeed: { unit: 's/km' as const, values },
    meanSpeed: { value: meanSpeed, unit: 'km/s' as const },
    largestSpeed: { value: distribution.largestSpeedKmPerS, unit: 'km/s' as const },
  };
}
