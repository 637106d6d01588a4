/** Poisson random numbers of a fixed mean. */
import { requireNonNegative } from '../errors.ts';
import { logPoissonProbability } from './poisson.ts';
import type { Random } from './random.ts';

const INVERSION_BELOW = 10;

/** Draws counts of the given mean, events, ≥ 0: by inversion below 10, by rejection above. */
export function poissonSampler(mean: number): (random: Random) => number {
  requireNonNegative('mean', mean);
  return mean < INVERSION_BELOW ? byInversion(mean) : byRejection(mean);
}

/** Adds probabilities from 0 up until they pass a uniform number (L. Devroye, Non-Uniform Random Variate Generation, 1986, X.3). */
function byInversion(mean: number): (random: Random) => number {
  const atZero = Math.exp(-mean);
  return (random) => {
    let left = random();
    let n = 0;
    for (let probability = atZero; left >= probability && probability > 0; ) {
      left -= probability;
      n++;
      probability *= mean / n;
    }
    return n;
  };
}

/** Transformed rejection with squeeze, PTRS of W. Hörmann, Insurance: Mathematics and Economics 12, 39 (1993); its symbols. */
function byRejection(mu: number): (random: Random) => number {
  const b = 0.931 + 2.53 * Math.sqrt(mu);
  const a = -0.059 + 0.02483 * b;
  const inverseAlpha = 1.1239 + 1.1328 / (b - 3.4);
  const vR = 0.9277 - 3.6224 / (b - 2);
  return (random) => {
    while (true) {
      const u = random() - 0.5;
      const v = random();
      const us = 0.5 - Math.abs(u);
      const k = Math.floor(((2 * a) / us + b) * u + mu + 0.43);
      if (us >= 0.07 && v <= vR) return k;
      if (k < 0 || (us < 0.013 && v > us)) continue;
      if (Math.log((v * inverseAlpha) / (a / (us * us) + b)) <= logPoissonProbability(k, mu)) return k;
    }
  };
}
