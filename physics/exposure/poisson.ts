/**
 * The Poisson distribution of counts: probabilities, tails, and the means that put a given probability in a tail.
 *
 * P(N ≥ k | μ) is the regularised lower incomplete gamma function P(k, μ), P(N ≤ n | μ) the upper one, Q(n+1, μ)
 * (Abramowitz & Stegun 26.4.21). Both continue to counts that are not integers.
 */
import gammainc from '@stdlib/math-base-special-gammainc';
import gammaincinv from '@stdlib/math-base-special-gammaincinv';
import gammaln from '@stdlib/math-base-special-gammaln';
import { DomainError } from '../errors.ts';
import { poissonDeviance } from './deviance.ts';
import { normalAbove } from './normal.ts';
import { requireProbability } from './probability.ts';

const LOG_TWO_PI = Math.log(2 * Math.PI);

/** ln n! minus Stirling's formula, for n > 0 (series: Abramowitz & Stegun 6.1.41). */
function stirlingError(n: number): number {
  if (n < 15) return gammaln(n + 1) - (n + 0.5) * Math.log(n) + n - LOG_TWO_PI / 2;
  const y = 1 / (n * n);
  return (1 / 12 - y * (1 / 360 - y * (1 / 1260 - y * (1 / 1680 - y / 1188)))) / n;
}

/**
 * ln P(N = n | μ) for real n ≥ 0 and μ ≥ 0. Written about its peak (C. Loader, "Fast and accurate computation of binomial
 * probabilities", 2000), so that it keeps 1e-13 absolute at any mean. −∞ where the count is impossible.
 */
export function logPoissonProbability(n: number, mean: number): number {
  if (n === 0) return -mean;
  if (mean === 0) return -Infinity;
  return -stirlingError(n) - poissonDeviance(n, mean - n, mean) - (LOG_TWO_PI + Math.log(n)) / 2;
}

/**
 * Means above which the probabilities are summed here. @stdlib/math-base-special-gammainc 0.3.1 then uses an expansion that fails
 * near the mean (0.9407 for Q(1092, 1050) = 0.8993). The direct sums need up to 9 √μ terms.
 */
const SUMMED_ABOVE = 1000;

/** P(N ≤ n | μ) for real n ≥ 0, μ ≥ 0; relative accuracy 1e-12 up to means of 1e5, also deep in the tail (test: sums of terms). */
export function probabilityOfAtMost(n: number, mean: number): number {
  if (!(mean > SUMMED_ABOVE)) return gammainc(mean, n + 1, true, true);
  return n < mean ? sumDownFrom(n, mean) : 1 - sumUpFrom(n + 1, mean);
}

/** P(N ≥ k | μ) for real k > 0, μ ≥ 0; same accuracy. */
export function probabilityOfAtLeast(k: number, mean: number): number {
  if (!(mean > SUMMED_ABOVE)) return gammainc(mean, k);
  return k > mean ? sumUpFrom(k, mean) : 1 - sumDownFrom(k - 1, mean);
}

/** P(k) + P(k + 1) + … for k above the mean, until the terms vanish (Abramowitz & Stegun 6.5.29). */
function sumUpFrom(k: number, mean: number): number {
  let sum = 0;
  let term = 1;
  for (let n = k; term > 1e-17; ) {
    sum += term;
    n++;
    term *= mean / n;
  }
  return Math.exp(logPoissonProbability(k, mean)) * sum;
}

/** P(n) + P(n − 1) + … for n below the mean; for real n the same asymptotic series (Abramowitz & Stegun 6.5.32). */
function sumDownFrom(n: number, mean: number): number {
  let sum = 0;
  let term = 1;
  for (let k = n; term > 1e-17; k--) {
    sum += term;
    term *= k / mean;
  }
  return Math.exp(logPoissonProbability(n, mean)) * sum;
}

/** The mean at which P(N ≤ n) is p, for real n ≥ 0 and 0 < p < 1; relative accuracy 1e-13, also for tiny p. */
export function meanForAtMost(n: number, p: number): number {
  return n === 0 ? -Math.log(p) : inverted(n + 1, p, 1 - p);
}

/** Above this count Wilson & Hilferty's start is as good as the library's inverse, and cheaper. */
const CUBE_ABOVE = 100;

/**
 * The mean with P(N ≥ k) = upper = 1 − lower. The library's inverse (good to 1e-3 in the tails only) or Wilson & Hilferty's cube
 * (Abramowitz & Stegun 26.4.17) starts Newton steps on the logarithm of the smaller tail, which is concave in the mean, so
 * that they converge from one side, quadratically.
 */
function inverted(k: number, lower: number, upper: number): number {
  let mean =
    k > CUBE_ABOVE ? cubeRule(k, lower, upper) : lower < upper ? gammaincinv(lower, k, true) : gammaincinv(upper, k);
  for (let step = 0; step < 50; step++) {
    const density = Math.exp(logPoissonProbability(k - 1, mean));
    const tail = lower < upper ? probabilityOfAtMost(k - 1, mean) : probabilityOfAtLeast(k, mean);
    const change = ((lower < upper ? Math.log(tail / lower) : -Math.log(tail / upper)) * tail) / density;
    mean += change;
    if (Math.abs(change) < 1e-10 * mean) break;
  }
  return mean;
}

function cubeRule(k: number, lower: number, upper: number): number {
  const z = lower < upper ? normalAbove(lower) : -normalAbove(upper);
  return k * (1 - 1 / (9 * k) + z / (3 * Math.sqrt(k))) ** 3;
}

/**
 * The smallest mean μ with P(N ≥ k) ≥ p.
 *
 * @param k counts wanted, an integer ≥ 1. @param p probability, 0 < p < 1.
 * @throws DomainError outside these. @example meanForAtLeast(1, 0.9) // 2.302585…
 */
export function meanForAtLeast(k: number, p: number): number {
  if (!(Number.isInteger(k) && k >= 1)) throw new DomainError('atLeast', k, 'an integer of at least 1');
  requireProbability('probability', p);
  return k === 1 ? -Math.log1p(-p) : inverted(k, 1 - p, p);
}

/**
 * Classical upper limit on a Poisson mean: the μ with P(N ≤ observed | μ) = 1 − confidence; for 0 events −ln(1 − confidence)
 * (Particle Data Group, Review of Particle Physics, Statistics).
 *
 * @throws DomainError unless `observed` is an integer ≥ 0 and 0 < confidence < 1. @example upperLimit(0, 0.9) // 2.302585…
 */
export function upperLimit(observed: number, confidence: number): number {
  if (!(Number.isInteger(observed) && observed >= 0))
    throw new DomainError('observed', observed, 'an integer of at least 0');
  requireProbability('confidence', confidence);
  return observed === 0 ? -Math.log1p(-confidence) : meanForAtLeast(observed + 1, confidence);
}
