/**
 * Unified intervals of Feldman & Cousins, Phys. Rev. D 57, 3873 (1998), for n events above a known background b: upper ends.
 *
 * μ: signal, λ = μ + b: mean count. At each μ the counts are accepted in decreasing order of
 * R(n) = P(n | μ + b)/P(n | μ̂(n) + b), μ̂ = max(0, n − b), until their probability reaches the confidence; n's interval is the
 * set of μ that accept n, and its upper end the largest of them.
 *
 * No grid in μ is needed. With h(n) = n ln m − m, m = max(n, b), a count j > n ranks before n exactly when
 * λ > λ_j = exp[(h(j) − h(n))/(j − n)] (valid for j ≥ b). So for λ between λ_j and λ_{j+1} the counts n+1…j come first, and n is
 * accepted there where G(λ) = P(n < N ≤ j | λ) < confidence. G rises to one maximum, at λ^(j−n) = j!/n!, and falls.
 */
import gammaln from '@stdlib/math-base-special-gammaln';
import { DomainError, requireNonNegative } from '../errors.ts';
import { bracketedRoot } from '../numeric/bracketed-root.ts';
import { gaussLegendre } from '../numeric/gauss-legendre.ts';
import { normalAbove, normalBelow, normalDensity } from './normal.ts';
import { logPoissonProbability, meanForAtMost, probabilityOfAtMost } from './poisson.ts';
import { requireProbability } from './probability.ts';

/** The last stretch of λ that accepts n: between λ_j and λ_{j+1}. */
interface LastAccepted {
  readonly j: number;
  /** Largest accepted λ. */
  readonly lambda: number;
}

const ROOT_TOLERANCE = 1e-10;
/** Outcomes rarer than this end the mean over counts; limits grow no faster than the count, so the neglect stays below 1e-9. */
const NEGLECTED_PROBABILITY = 1e-13;
/** Above this background, events, the mean limit follows its expansion for large b. */
const EXPANSION_ABOVE = 1000;
const RIPPLE_SAMPLES = 12;

function h(n: number, background: number): number {
  const m = Math.max(n, background);
  return (n === 0 ? 0 : n * Math.log(m)) - m;
}

/** λ above which j ranks before n < j. */
function overtaking(n: number, j: number, background: number): number {
  return Math.exp((h(j, background) - h(n, background)) / (j - n));
}

/** G: probability of the counts n+1…j. */
function probabilityBetween(n: number, j: number, lambda: number): number {
  return probabilityOfAtMost(j, lambda) - probabilityOfAtMost(n, lambda);
}

function acceptsBetween(n: number, j: number, background: number, confidence: number): boolean {
  return (
    probabilityBetween(n, j, overtaking(n, j + 1, background)) < confidence ||
    probabilityBetween(n, j, Math.max(background, overtaking(n, j, background))) < confidence
  );
}

/** Largest j whose stretch accepts n, by doubling and bisection: acceptance ends once (checked against a scan over all j). */
function lastAccepted(n: number, background: number, confidence: number): LastAccepted {
  let j = Math.max(n + 1, Math.floor(background));
  if (!acceptsBetween(n, j, background, confidence)) return { j, lambda: background };
  let step = Math.max(1, Math.round(0.4 * Math.sqrt(j)));
  while (acceptsBetween(n, j + step, background, confidence)) {
    j += step;
    step *= 2;
  }
  while (step > 1) {
    const half = step >> 1;
    if (acceptsBetween(n, j + half, background, confidence)) {
      j += half;
      step -= half;
    } else step = half;
  }
  const to = overtaking(n, j + 1, background);
  if (probabilityBetween(n, j, to) < confidence) return { j, lambda: to };
  const from = Math.max(background, overtaking(n, j, background));
  const excess = (lambda: number): number => probabilityBetween(n, j, lambda) - confidence;
  return { j, lambda: bracketedRoot(excess, from, to, ROOT_TOLERANCE).root };
}

interface UpwardJump {
  readonly background: number;
  /** The direct limit just after it, events. */
  readonly limit: number;
}

/**
 * The background b′ at which the direct limit jumps up because the stretch up to λ_{j+1} becomes accepted: λ_{j+1}(b′) = β, with β on
 * the falling side of G where G(β) = confidence. The limit is then β − b′. Undefined when no b′ > n does it.
 */
function upwardJump(n: number, j: number, confidence: number): UpwardJump | undefined {
  const atMaximum = Math.exp((gammaln(j + 1) - gammaln(n + 1)) / (j - n));
  if (probabilityBetween(n, j, atMaximum) <= confidence) return undefined;
  const lack = (lambda: number): number => confidence - probabilityBetween(n, j, lambda);
  const beta = bracketedRoot(lack, atMaximum, meanForAtMost(j, confidence / 2), ROOT_TOLERANCE).root;
  // λ_{j+1}(b′) = β is b′ − n ln b′ = target, convex in b′ and increasing above n: Newton from the right.
  const target = (j + 1 - n) * Math.log(beta) - h(j + 1, 0);
  let b = Math.max(beta, target, n + 1);
  for (let step = 0; step < 60; step++) {
    const change = n === 0 ? b - target : (b - n * Math.log(b) - target) / (1 - n / b);
    b -= change;
    if (!(b > n)) return undefined;
    if (Math.abs(change) < 1e-12 * b) break;
  }
  return { background: b, limit: beta - b };
}

/**
 * The upper end of the direct construction for n observed and background b, events, exact to 1e-9: it jumps where b lets
 * another count into the order.
 */
export function directUnifiedLimit(observed: number, background: number, confidence: number): number {
  checkLimit(observed, background, confidence);
  return lastAccepted(observed, background, confidence).lambda - background;
}

/**
 * Upper end of the unified interval, events, with the paper's rule that no limit grows as the background rises: the largest
 * direct limit at any b′ ≥ b. Continuous and non-increasing in b, exact to 1e-9.
 *
 * Between its upward jumps the direct limit falls (slope −1 or (λ/b)(b − n)/(j + 1 − n) − 1 < 0), and the heights after successive
 * jumps fall too, so the largest is the limit here or the height after the next jump (both checked against a scan,
 * test/physics/exposure/unified.test.ts, which also has the paper's tables).
 *
 * @param observed an integer ≥ 0. @param background events, ≥ 0. @param confidence between 0.5 and 1.
 * @throws DomainError outside these. @example unifiedUpperLimit(0, 0, 0.9) // 2.436
 */
export function unifiedUpperLimit(observed: number, background: number, confidence: number): number {
  checkLimit(observed, background, confidence);
  return limit(observed, background, confidence);
}

function limit(n: number, background: number, confidence: number): number {
  const { j, lambda } = lastAccepted(n, background, confidence);
  const here = lambda - background;
  for (let next = j; next <= j + 2; next++) {
    const jump = upwardJump(n, next, confidence);
    if (jump !== undefined && jump.background >= background) return Math.max(here, jump.limit);
  }
  return here;
}

function checkLimit(observed: number, background: number, confidence: number): void {
  if (!(Number.isInteger(observed) && observed >= 0))
    throw new DomainError('observed', observed, 'an integer of at least 0');
  requireNonNegative('background', background);
  requireConfidence(confidence);
}

function requireConfidence(confidence: number): void {
  requireProbability('confidence', confidence);
  if (!(confidence >= 0.5)) throw new DomainError('confidence', confidence, 'at least 0.5 and below 1');
}

/**
 * Mean unified upper limit over the outcomes of a background-only experiment (the paper's sensitivity), Σ_n P(n | b) μ₂(n, b), as
 * a function of b (events). Continuous; 1.734 √b for b → ∞ at 90 %.
 *
 * The sum, to 1e-9, up to b = 1000. Above, slope √b + c: the construction's steps leave a ripple of constant height, −0.02…+0.04
 * events about it, which is the error: below 7e-4 of the limit at b = 1000 and falling as 1/√b (measured for 60 to 95 % up to
 * b = 10⁴, test/physics/exposure/unified.test.ts).
 *
 * @throws DomainError unless 0.5 ≤ confidence < 1 (here) and b ≥ 0 is finite (when called).
 * @example meanUnifiedLimit(0.9)(3) // 4.421
 */
export function meanUnifiedLimit(confidence: number): (background: number) => number {
  requireConfidence(confidence);
  let expansion: ((background: number) => number) | undefined;
  return (background) => {
    requireNonNegative('background', background);
    if (background <= EXPANSION_ABOVE) return summedUnifiedLimit(background, confidence);
    expansion ??= largeBackgroundExpansion(confidence);
    return expansion(background);
  };
}

/** slope √b + c with c averaged over the ripple below the joint; what the ripple is at the joint fades out above it. */
function largeBackgroundExpansion(confidence: number): (background: number) => number {
  const slope = gaussianMeanLimit(confidence);
  const constantAt = (b: number): number => summedUnifiedLimit(b, confidence) - slope * Math.sqrt(b);
  let c = 0;
  for (let k = 1; k <= RIPPLE_SAMPLES; k++)
    c += constantAt((EXPANSION_ABOVE * (1 + k / RIPPLE_SAMPLES)) / 2) / RIPPLE_SAMPLES;
  const ripple = constantAt(EXPANSION_ABOVE) - c;
  return (background) => slope * Math.sqrt(background) + c + ripple * (EXPANSION_ABOVE / background) ** 4;
}

/** The mean as the sum over counts, at any background: what `meanUnifiedLimit` is checked against. */
export function summedUnifiedLimit(background: number, confidence: number): number {
  const likeliest = Math.floor(background);
  let sum = 0;
  const add = (n: number): boolean => {
    const probability = Math.exp(logPoissonProbability(n, background));
    if (probability < NEGLECTED_PROBABILITY) return false;
    sum += probability * limit(n, background, confidence);
    return true;
  };
  for (let n = likeliest; n >= 0 && add(n); n--);
  for (let n = likeliest + 1; add(n); n++);
  return sum;
}

/**
 * The mean limit in units of √b for b → ∞, where x = (n − b)/√b is normal and the signal may not be negative (section IV B of
 * the paper): for x ≥ 0 the limit is x + z, Φ(z) = (1 + confidence)/2; for x < 0 the u with
 * Φ(√(u² − 2xu)) − Φ(x − u) = confidence. 1.7337 at 90 %.
 */
export function gaussianMeanLimit(confidence: number): number {
  const z = normalAbove((1 - confidence) / 2);
  const { nodes, weights } = gaussLegendre(48);
  const depth = 8.5;
  let below = 0;
  for (let i = 0; i < nodes.length; i++) {
    const x = (depth / 2) * (nodes[i] - 1);
    const lack = (u: number): number => normalBelow(Math.sqrt(u * u - 2 * x * u)) - normalBelow(x - u) - confidence;
    below += (depth / 2) * weights[i] * normalDensity(x) * bracketedRoot(lack, 0, z, 1e-12).root;
  }
  return below + normalDensity(0) + z / 2;
}
