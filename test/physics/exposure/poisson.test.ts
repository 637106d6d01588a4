import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { excessOverLog } from '../../../physics/exposure/deviance.ts';
import {
  logPoissonProbability,
  meanForAtLeast,
  meanForAtMost,
  probabilityOfAtLeast,
  probabilityOfAtMost,
  upperLimit,
} from '../../../physics/exposure/poisson.ts';

/** Particle Data Group, Review of Particle Physics, Statistics: upper limits for 0…3 events, three decimals. */
const PDG_UPPER_LIMITS = [
  { observed: 0, at90: 2.303, at95: 2.996 },
  { observed: 1, at90: 3.89, at95: 4.744 },
  { observed: 2, at90: 5.322, at95: 6.296 },
  { observed: 3, at90: 6.681, at95: 7.754 },
];

describe('upperLimit', () => {
  it.each(PDG_UPPER_LIMITS)(
    'of $observed events is $at90 at 90 % and $at95 at 95 % (PDG)',
    ({ observed, at90, at95 }) => {
      expect(Math.abs(upperLimit(observed, 0.9) - at90)).toBeLessThan(6e-4);
      expect(Math.abs(upperLimit(observed, 0.95) - at95)).toBeLessThan(6e-4);
    },
  );

  it('refuses counts that are not whole and confidences outside 0…1', () => {
    for (const [n, confidence] of [
      [-1, 0.9],
      [0.5, 0.9],
      [0, 0],
      [0, 1],
      [0, Number.NaN],
    ]) {
      expect(() => upperLimit(n, confidence)).toThrow(DomainError);
    }
  });
});

describe('meanForAtLeast', () => {
  it('is −ln(1 − p) for one event', () => {
    expect(meanForAtLeast(1, 0.9)).toBeCloseTo(-Math.log(0.1), 13);
  });

  it('is undone by probabilityOfAtLeast, to 1e-12', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 5000 }), fc.double({ min: 1e-4, max: 0.9999, noNaN: true }), (k, p) => {
        expect(Math.abs(probabilityOfAtLeast(k, meanForAtLeast(k, p)) / p - 1)).toBeLessThan(1e-12);
      }),
      { numRuns: 300, seed: 1 },
    );
  });
});

describe('probabilityOfAtMost', () => {
  // Sums of the terms, each from logPoissonProbability; the strip 1000 < μ ≈ n is where the library's function fails.
  it.each([0.3, 7, 80, 300, 999, 1001, 1050, 1500, 10_000, 90_000])(
    'is the sum of the terms at mean %d, to 1e-12',
    (mean) => {
      const sigma = Math.sqrt(mean);
      let compared = 0;
      for (let x = -6; x <= 6; x += 0.25) {
        const n = Math.max(0, Math.round(mean + x * sigma));
        let sum = 0;
        for (let k = n; k >= Math.max(0, n - 14 * sigma - 30); k--) sum += Math.exp(logPoissonProbability(k, mean));
        expect(Math.abs(probabilityOfAtMost(n, mean) / sum - 1)).toBeLessThan(1e-12);
        expect(Math.abs(probabilityOfAtMost(n, mean) + probabilityOfAtLeast(n + 1, mean) - 1)).toBeLessThan(1e-12);
        compared++;
      }
      expect(compared).toBe(49);
    },
  );

  it('is inverted by meanForAtMost, also in the tail, to 1e-11', () => {
    for (const n of [0, 3, 50, 799, 801, 1100, 30_000]) {
      for (const p of [1e-12, 1e-4, 0.1, 0.5, 0.9, 0.999]) {
        expect(Math.abs(probabilityOfAtMost(n, meanForAtMost(n, p)) / p - 1)).toBeLessThan(1e-11);
      }
    }
  });
});

describe('logPoissonProbability', () => {
  it('is n ln μ − μ − ln n! for small counts', () => {
    let lnFactorial = 0;
    for (let n = 0; n <= 40; n++) {
      if (n > 0) lnFactorial += Math.log(n);
      for (const mean of [0.1, 3, 40]) {
        expect(Math.abs(logPoissonProbability(n, mean) - (n * Math.log(mean) - mean - lnFactorial))).toBeLessThan(
          1e-12 * (n + mean + 1),
        );
      }
    }
  });

  it('gives certainty of no events at mean 0', () => {
    expect(logPoissonProbability(0, 0)).toBeCloseTo(0, 15);
    expect(logPoissonProbability(2, 0)).toBe(-Infinity);
  });
});

describe('excessOverLog', () => {
  it('is x²/2 − x³/3 + … for small x, and continuous where the series ends', () => {
    for (const x of [1e-12, -1e-9, 1e-6, -1e-4]) {
      const series = x * x * (1 / 2 - x * (1 / 3 - x * (1 / 4 - x / 5)));
      expect(Math.abs(excessOverLog(x) / series - 1)).toBeLessThan(1e-14);
    }
    for (const x of [0.3, -0.3]) {
      expect(Math.abs(excessOverLog(x) / (x - Math.log1p(x)) - 1)).toBeLessThan(1e-14);
    }
  });
});
