/**
 * Draws of uncertain parameters from a Gaussian, x = mean + L z with L Lᵀ the covariance and z independent standard
 * normals, by the method of G. E. P. Box & M. E. Muller, Ann. Math. Stat. 29, 610 (1958). A draw that is not physical is
 * drawn anew and counted: the Gaussian is cut, not folded.
 */
import { DomainError, requirePositive } from '../errors.ts';
import { type Random, seededRandom } from '../exposure/random.ts';
import { cholesky } from './cholesky.ts';

export interface UncertainParameters {
  readonly means: readonly number[];
  /** One for each parameter, > 0 and uncorrelated; or the covariance, symmetric and positive definite. */
  readonly spread:
    | { readonly standardDeviations: readonly number[] }
    | { readonly covariance: readonly (readonly number[])[] };
}

export interface DrawSettings {
  /** Number of draws, from 1 to LARGEST_DRAWS. */
  readonly draws: number;
  /** As seededRandom. The same seed gives the same draws; more of them begin with the same. */
  readonly seed: number;
  /** Whether a draw can be: above zero, below c, consistent. All are, if left out. */
  readonly isPhysical?: (values: readonly number[]) => boolean;
}

export interface ParameterDraws {
  /** One row a draw, one value a parameter. */
  readonly values: readonly (readonly number[])[];
  /** Unphysical draws that were drawn anew. */
  readonly redrawn: number;
}

const LARGEST_DRAWS = 100_000;
/** Draws that may be unphysical for each that is wanted. */
const MOST_REDRAWN = 100;

/** Two independent standard normals at a time; the second is kept. */
export function standardNormals(random: Random): () => number {
  let kept: number | undefined;
  return () => {
    if (kept !== undefined) {
      const value = kept;
      kept = undefined;
      return value;
    }
    const radius = Math.sqrt(-2 * Math.log(1 - random()));
    const angle = 2 * Math.PI * random();
    kept = radius * Math.sin(angle);
    return radius * Math.cos(angle);
  };
}

function triangle({ means, spread }: UncertainParameters): number[][] {
  if ('covariance' in spread) {
    if (spread.covariance.length !== means.length)
      throw new DomainError('covariance', spread.covariance.length, `as many rows as parameters, ${means.length}`);
    return cholesky(spread.covariance, 'covariance');
  }
  if (spread.standardDeviations.length !== means.length)
    throw new DomainError(
      'standardDeviations',
      spread.standardDeviations.length,
      `as many as parameters, ${means.length}`,
    );
  return spread.standardDeviations.map((sigma, i) => {
    requirePositive('standardDeviations', sigma);
    return means.map((_, j) => (i === j ? sigma : 0));
  });
}

/**
 * @throws DomainError for no parameters, means that are not finite, spreads or a covariance that are not positive, a
 *   number of draws or a seed out of its domain, and parameters of which less than one draw in a hundred is physical
 * @example parameterDraws({ means: [238, 544], spread: { standardDeviations: [1.5, 35] } }, { draws: 1000, seed: 7 })
 */
export function parameterDraws(parameters: UncertainParameters, settings: DrawSettings): ParameterDraws {
  const { means } = parameters;
  const { draws, seed, isPhysical = () => true } = settings;
  if (!(Number.isInteger(draws) && draws >= 1 && draws <= LARGEST_DRAWS))
    throw new DomainError('draws', draws, `an integer from 1 to ${LARGEST_DRAWS}`);
  if (means.length === 0) throw new DomainError('parameters', 0, 'at least one parameter');
  for (const mean of means) if (!Number.isFinite(mean)) throw new DomainError('means', mean, 'finite numbers');
  const lower = triangle(parameters);
  const normal = standardNormals(seededRandom(seed));
  const values: number[][] = [];
  let redrawn = 0;
  while (values.length < draws) {
    const z = means.map(normal);
    const drawn = means.map((mean, i) => lower[i].reduce((sum, l, k) => sum + l * z[k], mean));
    if (isPhysical(drawn)) values.push(drawn);
    else if (++redrawn > MOST_REDRAWN * draws)
      throw new DomainError('parameters', redrawn, 'means and spreads of which at least 1 % of the draws are physical');
  }
  return { values, redrawn };
}
