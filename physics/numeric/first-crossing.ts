/** Where a rising function passes 0, when nothing is known of where that is. */
import { bracketedRoot, type Root } from './bracketed-root.ts';

/**
 * The root of a function that rises through 0 once, bracketed by steps of doubled length from `start` (the first is ln 2: the argument
 * is meant to be a logarithm), then found by bracketedRoot to `tolerance` (absolute half-width).
 *
 * The function must pass 0 at a finite argument; −∞ and +∞ are good values of it.
 * @example firstCrossing((u) => Math.exp(u) - 5, 0, 1e-11).root // ln 5
 */
export function firstCrossing(rising: (u: number) => number, start: number, tolerance: number): Root {
  let step = Math.LN2;
  let low = start;
  let high = start;
  if (rising(start) < 0) {
    do {
      low = high;
      high += step;
      step *= 2;
    } while (rising(high) < 0);
  } else {
    do {
      high = low;
      low -= step;
      step *= 2;
    } while (rising(low) > 0);
  }
  return bracketedRoot(rising, low, high, tolerance);
}
