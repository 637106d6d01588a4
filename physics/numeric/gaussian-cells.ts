/**
 * A normal distribution cut into cells of width one about the integers: what a Gaussian spread does to a count.
 *
 *   p_n = Φ((n + ½ − mean)/deviation) − Φ((n − ½ − mean)/deviation)
 *
 * Every difference is taken between tails on the side where they are small, so a cell far from the mean keeps its digits:
 * relative accuracy 1e-13, also at z = 16, where the rounding of z itself costs z² (test/physics/ionization/gaussian-cells.test.ts).
 */
import erfc from '@stdlib/math-base-special-erfc';

/** Probability beyond z on z's own side: 1 − Φ(|z|). */
function tailBeyond(z: number): number {
  return erfc(Math.abs(z) / Math.SQRT2) / 2;
}

/** Φ(to) − Φ(from) for from ≤ to, given the tails beyond both. */
function between(from: number, tailFrom: number, to: number, tailTo: number): number {
  if (from >= 0) return tailFrom - tailTo;
  return to <= 0 ? tailTo - tailFrom : 1 - tailFrom - tailTo;
}

/** Φ(to) − Φ(from) for from ≤ to; either may be infinite. */
export function normalBetween(from: number, to: number): number {
  return between(from, tailBeyond(from), to, tailBeyond(to));
}

/** Writes p_n for n = first, first + 1, … into out[0], out[1], …, out[count − 1]. deviation > 0. */
export function gaussianCells(
  mean: number,
  deviation: number,
  first: number,
  out: Float64Array,
  count = out.length,
): void {
  let from = (first - 0.5 - mean) / deviation;
  let tailFrom = tailBeyond(from);
  for (let i = 0; i < count; i++) {
    const to = (first + i + 0.5 - mean) / deviation;
    const tailTo = tailBeyond(to);
    out[i] = between(from, tailFrom, to, tailTo);
    from = to;
    tailFrom = tailTo;
  }
}
