/**
 * A root of f between two ends where it has opposite signs: Brent's method (R. P. Brent, Algorithms for Minimization without
 * Derivatives, Prentice-Hall 1973, chapter 4): inverse quadratic or linear interpolation, bisection where they do not help.
 */
import { DomainError } from '../errors.ts';

export interface Root {
  readonly root: number;
  /** The root lies within this of the true sign change (absolute); 0 where f vanished exactly. */
  readonly error: number;
  readonly evaluations: number;
}

const LARGEST_EVALUATIONS = 200;

/**
 * A root of f in [a, b], in the units of a and b. f may be discontinuous: then the place where its sign changes.
 *
 * @param tolerance absolute half-width of the final bracket, ≥ 0; rounding of the root itself (4e-16 relative) is added.
 * @throws DomainError when f has the same sign at both ends, or is NaN.
 * @example bracketedRoot((x) => x * x - 2, 0, 2, 1e-12).root // 1.41421356…
 */
export function bracketedRoot(f: (x: number) => number, a: number, b: number, tolerance: number): Root {
  let evaluations = 2;
  let [worse, atWorse] = [a, f(a)];
  let [best, atBest] = [b, f(b)];
  if (!(atWorse * atBest <= 0))
    throw new DomainError('bracket', [atWorse, atBest], 'values of opposite signs at the two ends');
  let [opposite, atOpposite] = [worse, atWorse];
  let step = best - worse;
  let stepBefore = step;
  while (true) {
    if (atBest > 0 === atOpposite > 0) {
      [opposite, atOpposite] = [worse, atWorse];
      step = best - worse;
      stepBefore = step;
    }
    if (Math.abs(atOpposite) < Math.abs(atBest)) {
      [worse, best, opposite] = [best, opposite, best];
      [atWorse, atBest, atOpposite] = [atBest, atOpposite, atBest];
    }
    const smallest = 2 * Number.EPSILON * Math.abs(best) + tolerance / 2;
    const toMiddle = (opposite - best) / 2;
    if (atBest === 0) return { root: best, error: 0, evaluations };
    if (Math.abs(toMiddle) <= smallest || evaluations >= LARGEST_EVALUATIONS) {
      return { root: best, error: 2 * Math.abs(toMiddle), evaluations };
    }
    const trial = interpolatedStep(worse, atWorse, best, atBest, opposite, atOpposite);
    const isFalling = Math.abs(stepBefore) >= smallest && Math.abs(atWorse) > Math.abs(atBest);
    if (isFalling && trial / toMiddle > 0 && isShort(trial, toMiddle, smallest, stepBefore)) {
      stepBefore = step;
      step = trial;
    } else {
      step = toMiddle;
      stepBefore = toMiddle;
    }
    [worse, atWorse] = [best, atBest];
    best += Math.abs(step) > smallest ? step : Math.sign(toMiddle) * smallest;
    atBest = f(best);
    evaluations++;
  }
}

/** Interpolation is kept only while it stays inside three quarters of the bracket and halves the step before the last. */
function isShort(trial: number, toMiddle: number, smallest: number, stepBefore: number): boolean {
  return (
    2 * Math.abs(trial) < 3 * Math.abs(toMiddle) - Math.abs(smallest) && 2 * Math.abs(trial) < Math.abs(stepBefore)
  );
}

/** Step from `best` to the root of the secant, or of the inverse parabola through three distinct points; NaN where undefined. */
function interpolatedStep(a: number, fa: number, b: number, fb: number, c: number, fc: number): number {
  const s = fb / fa;
  if (a === c) return ((c - b) * s) / (s - 1);
  const q = fa / fc;
  const r = fb / fc;
  return (s * ((b - a) * (r - 1) - (c - b) * q * (q - r))) / ((q - 1) * (r - 1) * (s - 1));
}
