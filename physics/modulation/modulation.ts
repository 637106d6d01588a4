/**
 * Annual modulation: what the rates on the days of a year say of their mean, their swing and the day of their maximum
 * (Drukier, Freese & Spergel, PRD 33, 3495 (1986)), and the exposure at which the modulation itself stands out,
 *
 *   Z² = X Σ_n A_n²/[2 (S̄_n + B_n)]
 *
 * A_n the annual Fourier amplitude of bin n, S̄_n its mean, B_n its constant background, over whole years. (Counts n_i in
 * short times are Poisson; the amplitude of cos ω(t − t₀) fitted by least squares has the variance 2 (S̄ + B)/X.)
 */
import { DomainError, requireNonNegative, requirePositive } from '../errors.ts';
import { FIRST_YEAR, LAST_YEAR } from '../halo/earth-velocity.ts';

export interface Modulation {
  /** Arithmetic mean of the rates: the time average, where the instants are evenly spaced over whole years. */
  readonly mean: number;
  /** (max − min)/2. */
  readonly amplitude: number;
  /** amplitude/mean; 0 where there is no rate at all. */
  readonly fractionalAmplitude: number;
  /** Index of the largest rate, the first of equals. */
  readonly maximumAt: number;
}

const DAY_MS = 86_400_000;

/**
 * 00:00 UTC of every day of a year, in milliseconds since 1970.
 *
 * @throws DomainError for a year for which the Earth's velocity is not known
 */
export function daysOfYear(year: number): number[] {
  if (!(Number.isInteger(year) && year >= FIRST_YEAR && year <= LAST_YEAR))
    throw new DomainError('year', year, `a year from ${FIRST_YEAR} to ${LAST_YEAR}`);
  const first = Date.UTC(year, 0, 1);
  const days = (Date.UTC(year + 1, 0, 1) - first) / DAY_MS;
  return Array.from({ length: days }, (_, day) => first + day * DAY_MS);
}

/**
 * Mean, amplitude and maximum of rates ≥ 0, one for each instant; any unit.
 *
 * @throws DomainError for no rates, or rates that are negative or not finite
 * @example modulation([1, 3, 2]) // { mean: 2, amplitude: 1, fractionalAmplitude: 0.5, maximumAt: 1 }
 */
export function modulation(rates: ArrayLike<number>): Modulation {
  if (rates.length === 0) throw new DomainError('rates', rates.length, 'at least one rate');
  let [sum, smallest, maximumAt] = [0, Infinity, 0];
  for (let i = 0; i < rates.length; i++) {
    requireNonNegative('rates', rates[i]);
    sum += rates[i];
    smallest = Math.min(smallest, rates[i]);
    if (rates[i] > rates[maximumAt]) maximumAt = i;
  }
  const mean = sum / rates.length;
  const amplitude = (rates[maximumAt] - smallest) / 2;
  return { mean, amplitude, fractionalAmplitude: mean > 0 ? amplitude / mean : 0, maximumAt };
}

/**
 * The annual Fourier amplitude (2/N) |Σ_i R_i exp(−2πi k i/N)| of N rates evenly spaced over k whole years: that of the
 * cosine, of whatever phase, that fits best. Exact for up to N/(2k) harmonics.
 *
 * @throws DomainError for fewer than three rates a year
 */
export function annualAmplitude(rates: ArrayLike<number>, years = 1): number {
  if (!(Number.isInteger(years) && years >= 1 && rates.length >= 3 * years))
    throw new DomainError('rates', rates.length, 'three or more for each of a whole number of years');
  let [cosine, sine] = [0, 0];
  for (let i = 0; i < rates.length; i++) {
    const phase = (2 * Math.PI * years * i) / rates.length;
    cosine += rates[i] * Math.cos(phase);
    sine += rates[i] * Math.sin(phase);
  }
  return (2 * Math.hypot(cosine, sine)) / rates.length;
}

export interface ModulatedBin {
  /** A_n, 1/(kg yr). */
  readonly annualAmplitude: number;
  /** S̄_n, 1/(kg yr). */
  readonly meanSignal: number;
  /** B_n, 1/(kg yr). */
  readonly background: number;
}

/**
 * The exposure, kg yr, over whole years, at which the modulation is seen at Z standard deviations: X = Z²/Σ A_n²/[2 (S̄_n
 * + B_n)]. undefined where nothing modulates.
 *
 * @throws DomainError for a significance that is not above 0, or rates below 0
 * @example modulationExposureKgYr([{ annualAmplitude: 1, meanSignal: 10, background: 40 }], 3) // 900
 */
export function modulationExposureKgYr(bins: readonly ModulatedBin[], significance: number): number | undefined {
  requirePositive('significance', significance);
  let perKgYr = 0; // Z² for each kg yr
  for (const { annualAmplitude: amplitude, meanSignal, background } of bins) {
    requireNonNegative('annualAmplitude', amplitude);
    requireNonNegative('meanSignal', meanSignal);
    requireNonNegative('background', background);
    if (amplitude > 0) perKgYr += amplitude ** 2 / (2 * (meanSignal + background));
  }
  const exposure = significance ** 2 / perKgYr;
  return exposure < Infinity ? exposure : undefined;
}
