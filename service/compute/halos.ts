/** Halos by their parameters, so that jobs which share one share its tabulated tail. */
import { type StandardHaloParameters, standardHalo } from '../../physics/halo/standard-halo.ts';
import type { VelocityDistribution } from '../../physics/halo/velocity-distribution.ts';

const MOST_HALOS = 32;
const halos = new Map<string, VelocityDistribution>(); // least recently used first

export function haloOf({
  circularSpeedKmPerS,
  escapeSpeedKmPerS,
  laboratorySpeedKmPerS,
  cutoff,
}: StandardHaloParameters): VelocityDistribution {
  const key = [circularSpeedKmPerS, escapeSpeedKmPerS, laboratorySpeedKmPerS, cutoff].join(' ');
  const halo =
    halos.get(key) ?? standardHalo({ circularSpeedKmPerS, escapeSpeedKmPerS, laboratorySpeedKmPerS, cutoff });
  halos.delete(key);
  halos.set(key, halo);
  if (halos.size > MOST_HALOS) halos.delete(halos.keys().next().value!);
  return halo;
}
