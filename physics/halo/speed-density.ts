/** The distribution of speeds in the laboratory, F(v) = v² ∮ f dΩ, from the mean inverse speed alone: F(v) = −v dη/dv. */
import { requireNonNegative } from '../errors.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

/** Step of the derivative as a share of the largest speed. */
const STEP = 2e-4;

/**
 * F(v), 1/(km/s), ∫ F dv = 1, for v ≥ 0 in km/s: the five-point derivative of η, with steps that do not reach across a
 * kink.
 *
 * A cold stream's share is a spike without width at its speed: it is not in F. At a kink itself F is that just above it.
 * Accuracy: 1e-7 of the largest F for the standard halo (test/physics/halo/speed-density.test.ts), what the slope of η is
 * good to for other models.
 *
 * @throws DomainError for a speed below 0
 */
export function speedDensity(halo: VelocityDistribution, vKmPerS: number): number {
  requireNonNegative('speed', vKmPerS);
  const largest = halo.largestSpeedKmPerS;
  if (vKmPerS === 0 || vKmPerS >= largest) return 0;
  const ends = [0, ...halo.kinksKmPerS, ...(halo.sectionEndsKmPerS ?? []), largest];
  const below = Math.max(...ends.filter((end) => end <= vKmPerS));
  const above = Math.min(...ends.filter((end) => end > vKmPerS));
  // the stencil's middle is moved off a kink that is too near, by two steps at most
  const step = Math.min(STEP * largest, (above - below) / 5);
  const middle = Math.min(Math.max(vKmPerS, below + 2 * step), above - 2 * step * (1 + 1e-9));
  const t = (vKmPerS - middle) / step;
  const eta = [-2, -1, 0, 1, 2].map((k) => halo.meanInverseSpeed(middle + k * step));
  const slope = derivativeWeights(t).reduce((sum, weight, k) => sum + weight * eta[k], 0) / step;
  return Math.max(0, -vKmPerS * slope);
}

/** Weights of the derivative at t of the quartic through −2, −1, 0, 1, 2 (Abramowitz & Stegun 25.3.6). */
function derivativeWeights(t: number): number[] {
  return [
    (2 * t ** 3 - 3 * t ** 2 - t + 1) / 12,
    -(4 * t ** 3 - 3 * t ** 2 - 8 * t + 4) / 6,
    (2 * t ** 3 - 5 * t) / 2,
    -(4 * t ** 3 + 3 * t ** 2 - 8 * t - 4) / 6,
    (2 * t ** 3 + 3 * t ** 2 - t - 1) / 12,
  ];
}
