/**
 * Dark current: electrons that appear in a pixel by themselves, at a constant mean rate, and pile up until the pixel is read. With
 * λ = current × interval, a pixel is read with n of them with probability P(n; λ) = e^{−λ} λⁿ/n!, so
 *
 *   rate_n = P(n; λ) / (pixel mass × interval)      per kg yr, n ≥ 0
 *
 * For λ ≪ 1 the n-electron rate grows as intervalⁿ⁻¹: reading twice as often halves the pairs and leaves the single electrons.
 */
import gammaln from '@stdlib/math-base-special-gammaln';
import { requireNonNegative, requirePositive } from '../errors.ts';

/** Days in a year: 365.25 by the contract. */
const DAYS_PER_YEAR = 365.25;

export interface DarkCurrent {
  /** Mean number of electrons per pixel and day, ≥ 0. */
  readonly electronsPerPixelPerDay: number;
  /** > 0. */
  readonly pixelMassKg: number;
  /** Time between two readings of a pixel, > 0. */
  readonly readoutIntervalDays: number;
}

/**
 * Rates, 1/(kg yr), of pixels that hold n = 0…lastElectron electrons of dark current. Relative accuracy 1e-13 while the
 * logarithm of P stays below 500, also for tiny λ (test/physics/detector/dark-current.test.ts). At zero current all are empty.
 *
 * @throws DomainError outside the domains named with the parameters
 */
export function darkCurrentRates(darkCurrent: DarkCurrent, lastElectron: number): Float64Array {
  const { electronsPerPixelPerDay, pixelMassKg, readoutIntervalDays } = darkCurrent;
  requireNonNegative('current', electronsPerPixelPerDay);
  requirePositive('pixelMass', pixelMassKg);
  requirePositive('readoutInterval', readoutIntervalDays);
  const lambda = electronsPerPixelPerDay * readoutIntervalDays;
  const readingsPerKgYear = DAYS_PER_YEAR / (pixelMassKg * readoutIntervalDays);
  return Float64Array.from({ length: lastElectron + 1 }, (_, n) => pileUpProbability(n, lambda) * readingsPerKgYear);
}

/** P(n; λ) through its logarithm, in the form that keeps the digits of λ ≪ 1 (a form about the peak n = λ would not). */
function pileUpProbability(n: number, lambda: number): number {
  if (n === 0) return Math.exp(-lambda);
  return lambda === 0 ? 0 : Math.exp(n * Math.log(lambda) - lambda - gammaln(n + 1));
}
