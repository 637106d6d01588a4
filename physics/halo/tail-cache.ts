/**
 * One tabulated tail per halo and range of speeds. Tabulating costs more than a rate on a small table, and every mass, mediator
 * and table can share it.
 */
import type { SpeedTail } from './speed-tail.ts';
import { speedTail } from './speed-tail.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

const tails = new WeakMap<VelocityDistribution, Map<number, SpeedTail>>();

/**
 * The tail of `halo` for speeds from lowestKmPerS on. It begins at v_max (1 − 2⁻ᵏ) with the largest k that still covers them, so
 * that a mass near threshold, which only the fastest particles feed, gets cells as fine as it needs.
 */
export function tailFrom(halo: VelocityDistribution, lowestKmPerS: number): SpeedTail {
  const distance = 1 - lowestKmPerS / halo.largestSpeedKmPerS;
  const k = Math.min(40, Math.max(0, Math.floor(-Math.log2(distance))));
  const ranges = tails.get(halo) ?? new Map<number, SpeedTail>();
  tails.set(halo, ranges);
  const known = ranges.get(k);
  if (known) return known;
  const tail = speedTail(halo, halo.largestSpeedKmPerS * (1 - 2 ** -k));
  ranges.set(k, tail);
  return tail;
}
