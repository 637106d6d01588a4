/**
 * Each parameter's share of the variance of a result, from the draws themselves: the result is fitted by a sum of
 * parabolas, one in each parameter, y ≈ a + Σ_j f_j(x_j), f_j = b_j z_j + c_j z_j², z_j the standardised parameter (least
 * squares), and
 *
 *   share_j = Cov(f_j, y)/Var(y)
 *
 * For independent parameters that is the first-order sensitivity index (I. M. Sobol′, Math. Comput. Simul. 55, 271
 * (2001)) of the fit; for correlated ones the covariance decomposition (G. Li et al., J. Phys. Chem. A 114, 6022 (2010)),
 * in which a share may be slightly negative. The shares sum to the fit's R²; what is missing from 1 is interaction and
 * steeper curvature.
 */
import { DomainError } from '../errors.ts';
import { cholesky, choleskySolve } from './cholesky.ts';

export interface VarianceShares {
  /** One for each parameter. */
  readonly shares: readonly number[];
  /** 1 − Σ shares: what no sum of parabolas explains. */
  readonly unexplained: number;
}

function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}

/** A spread below this share of the mean is one of rounding. */
const ROUNDING = 1e-13;

/** Values less their mean, over their standard deviation (or 0, where they do not vary). */
function standardised(values: readonly number[]): number[] {
  const centre = mean(values);
  const deviation = Math.sqrt(mean(values.map((value) => (value - centre) ** 2)));
  return values.map((value) => (deviation > ROUNDING * Math.abs(centre) ? (value - centre) / deviation : 0));
}

function product(a: readonly number[], b: readonly number[]): number {
  return a.reduce((sum, value, i) => sum + value * b[i], 0) / a.length;
}

/**
 * The shares of a result's variance; `draws` has one row of parameters for each result. All 0 for a result that does not
 * vary; undefined where results are not finite, or too few for the fit (fewer than twice its coefficients). Sampling
 * error: about 1/√draws.
 *
 * @throws DomainError for rows and results of different number
 * @example varianceShares([[0, 1], [1, 0], …], [0, 1, …])
 */
export function varianceShares(
  draws: readonly (readonly number[])[],
  results: readonly number[],
): VarianceShares | undefined {
  if (draws.length !== results.length)
    throw new DomainError('results', results.length, `as many results as draws, ${draws.length}`);
  const parameters = draws[0]?.length ?? 0;
  const coefficients = 2 * parameters;
  if (draws.length < 2 * (coefficients + 1) || !results.every(Number.isFinite)) return undefined;
  const y = standardised(results);
  if (product(y, y) === 0) return { shares: new Array(parameters).fill(0), unexplained: 0 };
  const features: number[][] = [];
  for (let j = 0; j < parameters; j++) {
    const z = standardised(draws.map((row) => row[j]));
    features.push(z, standardised(z.map((value) => value * value)));
  }
  // a hair on the diagonal: a parameter that does not vary leaves a row of zeros
  const normal = features.map((a, i) => features.map((b, k) => product(a, b) + (i === k ? 1e-9 : 0)));
  const towards = features.map((a) => product(a, y));
  const fit = choleskySolve(cholesky(normal, 'draws'), towards);
  const shares = Array.from(
    { length: parameters },
    (_, j) => fit[2 * j] * towards[2 * j] + fit[2 * j + 1] * towards[2 * j + 1],
  );
  return { shares, unexplained: 1 - shares.reduce((sum, share) => sum + share, 0) };
}
