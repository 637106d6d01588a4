import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { logPoissonProbability } from '../../../physics/exposure/poisson.ts';
import {
  directUnifiedLimit,
  gaussianMeanLimit,
  meanUnifiedLimit,
  summedUnifiedLimit,
  unifiedUpperLimit,
} from '../../../physics/exposure/unified.ts';

/** Feldman & Cousins, Phys. Rev. D 57, 3873 (1998), 90 % upper ends for n = 0…10; a direct construction agrees to ±0.02. */
const PUBLISHED = [
  { background: 0, ends: [2.44, 4.36, 5.91, 7.42, 8.6, 9.99, 11.47, 12.53, 13.99, 15.3, 16.5] },
  { background: 3, ends: [1.08, 1.88, 3.04, 4.42, 5.6, 6.99, 8.47, 9.53, 10.99, 12.3, 13.5] },
];
const PUBLISHED_TOLERANCE = 0.02;

/** The construction as the paper words it, on a grid of μ: counts ranked by R, accepted until their probability is enough. */
function upperEndsOnGrid(background: number, confidence: number, step: number, largestCount: number): number[] {
  const ends = new Array<number>(largestCount + 1).fill(0);
  for (let mu = 0; mu < 30; mu += step) {
    const counts = Array.from({ length: 90 }, (_, n) => {
      const ln = logPoissonProbability(n, mu + background);
      return { n, probability: Math.exp(ln), rank: ln - logPoissonProbability(n, Math.max(n, background)) };
    }).sort((a, b) => b.rank - a.rank);
    let sum = 0;
    for (const { n, probability } of counts) {
      if (sum >= confidence) break;
      sum += probability;
      if (n <= largestCount) ends[n] = mu;
    }
  }
  return ends;
}

describe('unifiedUpperLimit', () => {
  for (const { background, ends } of PUBLISHED) {
    it.each(ends.map((end, n) => ({ n, end })))(
      `of $n events above ${background} is $end at 90 % (Feldman & Cousins)`,
      ({ n, end }) => {
        expect(Math.abs(unifiedUpperLimit(n, background, 0.9) - end)).toBeLessThan(PUBLISHED_TOLERANCE);
      },
    );
  }

  it('is the largest direct limit at any background from there on (scan of 40 events in steps of 0.05)', () => {
    let compared = 0;
    for (const confidence of [0.68, 0.9, 0.95]) {
      for (const n of [0, 1, 5, 20]) {
        for (const b of [0, 0.3, 2.7, 11.3, 30]) {
          let largest = 0;
          for (let more = 0; more < 40; more += 0.05)
            largest = Math.max(largest, directUnifiedLimit(n, b + more, confidence));
          const limit = unifiedUpperLimit(n, b, confidence);
          expect(limit).toBeGreaterThanOrEqual(largest - 1e-9);
          // The limit falls at most as fast as b rises, so a scan in steps of 0.05 misses no more.
          expect(limit).toBeLessThan(largest + 0.05);
          compared++;
        }
      }
    }
    expect(compared).toBe(60);
  });

  it('never grows with the background', () => {
    for (const n of [0, 2, 8]) {
      let before = Infinity;
      for (let b = 0; b < 30; b += 0.1) {
        const limit = unifiedUpperLimit(n, b, 0.9);
        expect(limit).toBeLessThanOrEqual(before + 1e-9);
        before = limit;
      }
    }
  });

  it('refuses what is not a count, a background or a confidence of at least one half', () => {
    expect(() => unifiedUpperLimit(1.5, 0, 0.9)).toThrow(DomainError);
    expect(() => unifiedUpperLimit(1, -1, 0.9)).toThrow(DomainError);
    expect(() => unifiedUpperLimit(1, 1, 0.3)).toThrow(DomainError);
  });
});

describe('directUnifiedLimit', () => {
  it.each([0, 1.3, 3, 8])('is the construction on a grid of μ, to the grid step (background %d)', (background) => {
    const step = 0.005;
    upperEndsOnGrid(background, 0.9, step, 10).forEach((end, n) => {
      const limit = directUnifiedLimit(n, background, 0.9);
      expect(limit - end).toBeGreaterThan(-1e-9);
      expect(limit - end).toBeLessThan(step + 1e-9);
    });
  });

  it('is 0.95 for no events above 3, where the paper lifts it to 1.08', () => {
    expect(directUnifiedLimit(0, 3, 0.9)).toBeCloseTo(0.95, 2);
  });
});

describe('meanUnifiedLimit', () => {
  const mean = meanUnifiedLimit(0.9);

  it.each([
    { background: 0, sensitivity: 2.44 },
    { background: 1, sensitivity: 3.28 },
    { background: 3, sensitivity: 4.42 },
    { background: 5, sensitivity: 5.18 },
  ])('at background $background is the sensitivity $sensitivity (Feldman & Cousins)', ({ background, sensitivity }) => {
    expect(Math.abs(mean(background) - sensitivity)).toBeLessThan(PUBLISHED_TOLERANCE);
  });

  it('tends to 1.734 √b', () => {
    expect(gaussianMeanLimit(0.9)).toBeCloseTo(1.734, 3);
    expect(mean(1e10) / 1e5).toBeCloseTo(1.734, 3);
  });

  it('above 1000 is within 7e-4 √(1000/b) of the sum over counts', () => {
    for (const b of [1001, 1300, 2900]) {
      expect(Math.abs(mean(b) / summedUnifiedLimit(b, 0.9) - 1)).toBeLessThan(7e-4 * Math.sqrt(1000 / b));
    }
  });

  it('rises with the background more slowly than in proportion, so that an exposure has one root', () => {
    let before = mean(0.05);
    for (let b = 0.1; b < 60; b += 0.05) {
      const limit = mean(b);
      expect(limit).toBeGreaterThan(before);
      expect(limit / b).toBeLessThan(before / (b - 0.05));
      before = limit;
    }
  });

  it('is continuous at 1000', () => {
    expect(Math.abs(mean(1000.0001) - mean(1000))).toBeLessThan(1e-4);
  });
});
