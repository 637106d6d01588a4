/** The halo-independent response of a scenario, as it goes out. */
import { responseKernel } from '../../physics/rate/response.ts';
import type { RatesAnswer } from '../schemas/rates.ts';
import type { RatesJob } from './rates-answer.ts';
import { requireBelowLight, responseOf } from './response-scenario.ts';
import { unrepresentable } from './unrepresentable.ts';
import { largestSpeedKmPerS, shapeOf } from './velocity-distributions.ts';

/** K goes up to here, km/s, or to the scenario's own largest speed: faster than any halo that the galaxy holds. */
const FASTEST_KM_PER_S = 1000;

export function responseOut(job: RatesJob): NonNullable<RatesAnswer['response']> {
  const { halo, ionization } = job.scenario;
  const largest = Math.max(FASTEST_KM_PER_S, largestSpeedKmPerS(halo));
  requireBelowLight(largest, '');
  const kernel = responseKernel(responseOf(job, ionization.maxElectrons, largest, shapeOf(halo)));
  const finite = kernel.kernels.every((values) => values.every((value) => value >= 0 && value < Infinity));
  if (!finite) throw unrepresentable();
  return {
    speeds: { unit: 'km/s', edges: [...kernel.speedEdgesKmPerS] },
    kernels: Array.from({ length: ionization.maxElectrons }, (_, bin) => ({
      electrons: bin + 1,
      values: { unit: '1/(kg yr)', values: [...(kernel.kernels[bin] ?? [])] },
    })),
  };
}
