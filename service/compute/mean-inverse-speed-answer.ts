/** The answer of POST /v1/halo/mean-inverse-speed: runs in a worker thread. */
import { meanSpeedKmPerS } from '../../physics/halo/mean-speed.ts';
import type { HaloIn } from '../schemas/halo.ts';
import { haloOf } from './halos.ts';

export interface MeanInverseSpeedJob {
  readonly halo: HaloIn;
  readonly speedsKmPerS: readonly number[];
}

export function meanInverseSpeedAnswer({ halo, speedsKmPerS }: MeanInverseSpeedJob) {
  const distribution = haloOf(halo);
  return {
    meanInverseSpeed: { unit: 's/km' as const, values: speedsKmPerS.map((v) => distribution.meanInverseSpeed(v)) },
    meanSpeed: { value: meanSpeedKmPerS(distribution), unit: 'km/s' as const },
    largestSpeed: { value: distribution.largestSpeedKmPerS, unit: 'km/s' as const },
  };
}
