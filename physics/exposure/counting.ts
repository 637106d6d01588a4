/**
 * The counting experiment with a known background: one number of events, and the CLs upper limit on its signal.
 *
 * CLs = P(N ≤ n | s + b)/P(N ≤ n | b) (A. L. Read, J. Phys. G 28, 2693 (2002)); the upper limit is the signal with
 * CLs = 1 − confidence. b, s: expected background and signal, events. α = 1 − confidence.
 */
import { requireNonNegative } from '../errors.ts';
import { normalAbove, normalDensity } from './normal.ts';
import { logPoissonProbability, meanForAtMost, probabilityOfAtMost, upperLimit } from './poisson.ts';
import { requireProbability } from './probability.ts';

/** Above this background the mean over counts is an integral over a continuous count. */
const CONTINUOUS_ABOVE = 100;
/** Above this background the mean limit follows its expansion in 1/√b: inverting the gamma function becomes slow. */
const EXPANSION_ABOVE = 1e5;
/** Outcomes further than this many √b from the mean are neglected: less than 1e-14 of the probability. */
const LARGEST_DEVIATION = 8.5;
/** Sum over outcomes ends where the rest has less than this probability (times a limit that grows linearly with the count). */
const NEGLECTED_PROBABILITY = 1e-15;

/**
 * CLs upper limit on the signal, events, for n ≥ 0 observed (real) above a known background b ≥ 0.
 *
 * P(N ≤ n | s + b) = α P(N ≤ n | b) is inverted for s + b. Accuracy 1e-12 relative (to s + b). Equal to the classical limit for
 * b = 0, and for n = 0 at any b.
 */
export function clsUpperLimit(n: number, background: number, confidence: number): number {
  if (background === 0) return Number.isInteger(n) ? upperLimit(n, confidence) : meanForAtMost(n, 1 - confidence);
  if (n === 0) return -Math.log1p(-confidence);
  return meanForAtMost(n, (1 - confidence) * probabilityOfAtMost(n, background)) - background;
}

/**
 * Mean CLs upper limit over the outcomes of a background-only experiment, Σ_n P(n | b) s_up(n, b), as a function of b (events).
 * Increasing and smooth in b; −ln α at b = 0; φ(z)/α √b for b → ∞, Φ(z) = α, which is 1.755 √b at 90 %
 * (mean of z(α u) over uniform u).
 *
 * Up to b = 100 the sum itself; above, the trapezoidal rule over a continuous count in steps of √b/4, which the Gaussian fall
 * of the integrand makes exact to rounding; above 1e5 an expansion in 1/√b. Accuracy 1e-9 relative, 1e-11 where it sums
 * (test/physics/exposure/counting.test.ts).
 *
 * @throws DomainError unless 0 < confidence < 1 (here) and b ≥ 0 is finite (when called).
 * @example meanCountingLimit(0.9)(0) // 2.302585…
 */
export function meanCountingLimit(confidence: number): (background: number) => number {
  requireProbability('confidence', confidence);
  let expansion: ((background: number) => number) | undefined;
  return (background) => {
    requireNonNegative('background', background);
    if (background <= CONTINUOUS_ABOVE) return summedCountingLimit(background, confidence);
    if (background <= EXPANSION_ABOVE) return meanOverContinuousCounts(background, confidence);
    expansion ??= largeBackgroundExpansion(confidence);
    return expansion(background);
  };
}

/** The mean as the sum over counts, at any background: what `meanCountingLimit` is checked against. */
export function summedCountingLimit(background: number, confidence: number): number {
  let sum = 0;
  const first = Math.max(0, Math.floor(background - LARGEST_DEVIATION * Math.sqrt(background)));
  for (let n = first; n <= background || probabilityOfMore(n, background) > NEGLECTED_PROBABILITY; n++) {
    sum += Math.exp(logPoissonProbability(n, background)) * clsUpperLimit(n, background, confidence);
  }
  return sum;
}

/** A bound on P(N ≥ n | b) for n > b: the geometric series through the first term. */
function probabilityOfMore(n: number, background: number): number {
  return Math.exp(logPoissonProbability(n, background)) / (1 - background / (n + 1));
}

function meanOverContinuousCounts(background: number, confidence: number): number {
  const step = Math.sqrt(background) / 4;
  const steps = Math.ceil(4 * LARGEST_DEVIATION);
  let sum = 0;
  for (let k = -steps; k <= steps; k++) {
    const n = background + k * step;
    sum += Math.exp(logPoissonProbability(n, background)) * clsUpperLimit(n, background, confidence);
  }
  return sum * step;
}

/** slope √b + c + d/√b: the slope of the Gaussian limit is known, c and d make it exact at the joint and at a quarter of it. */
function largeBackgroundExpansion(confidence: number): (background: number) => number {
  const alpha = 1 - confidence;
  const slope = normalDensity(normalAbove(alpha)) / alpha;
  const root = Math.sqrt(EXPANSION_ABOVE);
  const atJoint = meanOverContinuousCounts(EXPANSION_ABOVE, confidence) - slope * root;
  const atQuarter = meanOverContinuousCounts(EXPANSION_ABOVE / 4, confidence) - slope * (root / 2);
  const d = (atQuarter - atJoint) * root;
  const c = atJoint - d / root;
  return (background) => slope * Math.sqrt(background) + c + d / Math.sqrt(background);
}
