/** Halos by their parameters, so that jobs which share one share its tabulated tail. */
import type { VelocityDistribution } from '../../physics/halo/velocity-distribution.ts';
import type { HaloIn } from '../schemas/halo.ts';
import { kept } from './kept.ts';
import { distributionOf } from './velocity-distributions.ts';

const MOST_HALOS = 32;
const halos = new Map<string, VelocityDistribution>(); // least recently used first

export function haloOf(parameters: HaloIn): VelocityDistribution {
  return kept(halos, MOST_HALOS, keyOf(parameters), () => distributionOf(parameters));
}

/** All that the distribution depends on. */
function keyOf(halo: HaloIn): string {
  if (halo.model === undefined)
    return [halo.circularSpeedKmPerS, halo.escapeSpeedKmPerS, halo.laboratorySpeedKmPerS, halo.cutoff].join(' ');
  return JSON.stringify({ ...halo, localDensityGevPerCm3: undefined });
}
