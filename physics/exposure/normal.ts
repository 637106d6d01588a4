/** The standard normal distribution: probability of exceeding z, and back. */
import erfc from '@stdlib/math-base-special-erfc';
import gammaincinv from '@stdlib/math-base-special-gammaincinv';
import { requireProbability } from './probability.ts';

/** φ(z) = exp(−z²/2)/√(2π). */
export function normalDensity(z: number): number {
  return Math.exp(-(z * z) / 2) / Math.sqrt(2 * Math.PI);
}

/** Φ(z), the probability of a value below z; relative accuracy 1e-15 times max(1, z²). */
export function normalBelow(z: number): number {
  return erfc(-z / Math.SQRT2) / 2;
}

/**
 * The z above which lies the probability `tail`: Φ⁻¹(1 − tail), 0 < tail < 1, without forming 1 − tail.
 *
 * From ½ Q(½, z²/2) = tail (Abramowitz & Stegun 6.5.17), then Newton steps on ln Φ, which is concave. Absolute accuracy 1e-14 for
 * 1e-300 < tail (test/physics/exposure/normal.test.ts).
 */
export function normalAbove(tail: number): number {
  requireProbability('tail', tail);
  if (tail === 0.5) return 0;
  if (tail > 0.5) return -normalAbove(1 - tail);
  let z = Math.sqrt(2 * gammaincinv(2 * tail, 0.5, true));
  for (let step = 0; step < 20; step++) {
    const reached = normalBelow(-z);
    const change = (Math.log(reached / tail) * reached) / normalDensity(z);
    z += change;
    if (Math.abs(change) < 1e-9) break;
  }
  return z;
}
