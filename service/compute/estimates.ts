/** Rates with the error of their integration: summed, and as they go out. */
import type { Estimate } from '../../physics/rate/crystal-rate.ts';

export function rateOut(rate: Estimate): { value: number; unit: '1/(kg yr)'; relativeError: number } {
  return { value: rate.value, unit: '1/(kg yr)', relativeError: rate.relativeError };
}

/** Sum of rates; their errors, which come from one integration, are added up. */
export function sumOf(rates: readonly Estimate[]): Estimate {
  const value = rates.reduce((sum, r) => sum + r.value, 0);
  const error = rates.reduce((sum, r) => sum + r.value * r.relativeError, 0);
  return { value, relativeError: value > 0 ? error / value : 0 };
}
