/** Quantiles of a sample. */
import { DomainError } from '../errors.ts';

/** The shares reported of a result: median, one and two standard deviations of a Gaussian (5 and 95 %: 1.64). */
export const REPORTED_QUANTILES = [0.05, 0.16, 0.5, 0.84, 0.95] as const;

/**
 * Quantiles of values that may include Infinity (an exposure out of reach), by linear interpolation between order
 * statistics at (n − 1)p (definition 7 of R. J. Hyndman & Y. Fan, Am. Stat. 50, 361 (1996)). Between a finite value and
 * Infinity: Infinity.
 *
 * @throws DomainError for no values, a NaN, or a share outside 0…1
 * @example quantiles([3, 1, 2], [0.5, 1]) // [2, 3]
 */
export function quantiles(values: ArrayLike<number>, shares: readonly number[] = REPORTED_QUANTILES): number[] {
  if (values.length === 0) throw new DomainError('values', 0, 'at least one value');
  const sorted = Float64Array.from(values).sort();
  if (Number.isNaN(sorted[sorted.length - 1])) throw new DomainError('values', Number.NaN, 'numbers');
  return shares.map((share) => {
    if (!(share >= 0 && share <= 1)) throw new DomainError('shares', share, 'from 0 to 1');
    const position = (sorted.length - 1) * share;
    const below = Math.floor(position);
    const t = position - below;
    return t === 0 ? sorted[below] : sorted[below] + t * (sorted[below + 1] - sorted[below]);
  });
}
