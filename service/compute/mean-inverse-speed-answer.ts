/** The answer of POST /v1/halo/mean-inverse-speed: runs in a worker thread. */
import type { z } from 'zod';
import { meanSpeedKmPerS } from '../../physics/halo/mean-speed.ts';
import { speedDensity } from '../../physics/halo/speed-density.ts';
import { Problem } from '../problem.ts';
import { type HaloIn, isMoving } from '../schemas/halo.ts';
import type { MeanInverseSpeedAnswer, MeanInverseSpeedRequest } from '../schemas/mean-inverse-speed.ts';
import { haloOf } from './halos.ts';
import { tabulatedDistribution } from './velocity-distributions.ts';

export type MeanInverseSpeedJob = MeanInverseSpeedRequest;
type Answer = z.output<typeof MeanInverseSpeedAnswer>;

export function meanInverseSpeedAnswer({ halo, speedsKmPerS, speedDistribution }: MeanInverseSpeedJob): Answer {
  const distribution = haloOf(halo);
  const values = speedsKmPerS.map((v) => distribution.meanInverseSpeed(v));
  const densities = speedDistribution ? speedsKmPerS.map((v) => speedDensity(distribution, v)) : [];
  const meanSpeed = meanSpeedKmPerS(distribution);
  if (![...values, ...densities, meanSpeed].every((value) => value >= 0 && value < Infinity)) {
    const detail = 'the speeds are so small, or so unlike each other, that the numbers cannot be represented';
    throw new Problem('invalid-input', 'The request has 1 fault.', [{ pointer: '/halo', detail }]);
  }
  return {
    meanInverseSpeed: { unit: 's/km', values },
    ...(speedDistribution ? { speedDistribution: { unit: 's/km', values: densities } } : {}),
    meanSpeed: { value: meanSpeed, unit: 'km/s' },
    largestSpeed: { value: distribution.largestSpeedKmPerS, unit: 'km/s' },
    ...(speedDistribution || halo.model !== undefined
      ? { localDensity: { value: halo.localDensityGevPerCm3, unit: 'GeV/cm^3' } }
      : {}),
    ...laboratoryOut(halo),
    ...(halo.model === 'tabulated' ? { normalisation: tabulatedDistribution(halo).normalisation } : {}),
  };
}

function laboratoryOut(halo: HaloIn): Pick<Answer, 'laboratorySpeed'> {
  return isMoving(halo) && halo.laboratoryVelocityKmPerS !== undefined
    ? { laboratorySpeed: { value: halo.laboratorySpeedKmPerS, unit: 'km/s' } }
    : {};
}
