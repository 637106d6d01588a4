/** Differences of nearly equal logarithms, without losing the digits that make a likelihood ratio. */

/** Below this |x| the direct difference x − ln(1+x) would lose more than a digit. */
const SERIES_BELOW = 0.3;

/**
 * x − ln(1+x) for x ≥ −1 (∞ at −1), relative accuracy 1e-15 (test/physics/exposure/poisson.test.ts). With r = x/(2+x),
 * ln(1+x) = 2 artanh r (Abramowitz & Stegun 4.1.27), so the difference is x r − 2 r³ (1/3 + r²/5 + r⁴/7 + …).
 */
export function excessOverLog(x: number): number {
  if (Math.abs(x) > SERIES_BELOW) return x - Math.log(1 + x);
  const r = x / (2 + x);
  const y = r * r;
  const sum =
    1 / 3 +
    y * (1 / 5 + y * (1 / 7 + y * (1 / 9 + y * (1 / 11 + y * (1 / 13 + y * (1 / 15 + y * (1 / 17 + y * (1 / 19))))))));
  return r * (x - 2 * y * sum);
}

/**
 * How much less likely n counts are at the mean ν = n + excess than at the mean n itself: ν − n − n ln(ν/n) ≥ 0. Half of a
 * Poisson bin's contribution to −2 ln(likelihood ratio). Both the excess and ν are passed: near n the excess has the digits, far
 * below it (a bin with 1e-20 expected and one seen) the mean has them.
 */
export function poissonDeviance(n: number, excess: number, mean: number): number {
  if (n === 0) return excess;
  const x = excess / n;
  return x < -SERIES_BELOW ? excess - n * Math.log(mean / n) : n * excessOverLog(x);
}
