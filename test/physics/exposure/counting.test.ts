import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { clsUpperLimit, meanCountingLimit, summedCountingLimit } from '../../../physics/exposure/counting.ts';
import { probabilityOfAtMost, upperLimit } from '../../../physics/exposure/poisson.ts';

describe('clsUpperLimit', () => {
  it('without background is the classical limit', () => {
    for (let n = 0; n <= 20; n++) expect(clsUpperLimit(n, 0, 0.9)).toBe(upperLimit(n, 0.9));
  });

  it('without events is the classical limit at any background', () => {
    for (const b of [0.1, 3, 1000]) expect(clsUpperLimit(0, b, 0.9)).toBeCloseTo(Math.log(10), 12);
  });

  it('solves CLs = 1 − confidence', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 0, max: 300 }),
        fc.double({ min: 0.01, max: 200, noNaN: true }),
        fc.double({ min: 0.5, max: 0.99, noNaN: true }),
        (n, b, confidence) => {
          const s = clsUpperLimit(n, b, confidence);
          expect(
            Math.abs(probabilityOfAtMost(n, s + b) / probabilityOfAtMost(n, b) / (1 - confidence) - 1),
          ).toBeLessThan(1e-10);
        },
      ),
      { numRuns: 200, seed: 1 },
    );
  });
});

describe('meanCountingLimit', () => {
  const mean = meanCountingLimit(0.9);

  it('without background is −ln(1 − confidence)', () => {
    expect(mean(0)).toBeCloseTo(Math.log(10), 13);
    expect(mean(1e-9)).toBeCloseTo(Math.log(10), 8);
  });

  it('tends to 1.755 √b (common practice; φ(z)/α exactly)', () => {
    expect(mean(1e12) / 1e6).toBeCloseTo(1.755, 3);
    expect(mean(1e16) / 1e8).toBeCloseTo(1.754983319, 6);
  });

  it.each([101, 400, 3000])('at %d, over continuous counts, is the sum over counts', (b) => {
    expect(Math.abs(mean(b) / summedCountingLimit(b, 0.9) - 1)).toBeLessThan(1e-11);
  });

  it('continues in 1/√b to 1e-9 (sum over 5,000 counts at 3e5)', () => {
    expect(Math.abs(mean(3e5) / summedCountingLimit(3e5, 0.9) - 1)).toBeLessThan(1e-9);
  });

  it('rises with the background, also across the joints', () => {
    let before = mean(0);
    const backgrounds = [1e-3, 0.1, 1, 10, 99.9999, 100.0001, 500, 99_999.9, 100_000.1, 1e7];
    for (const b of backgrounds) {
      expect(mean(b)).toBeGreaterThan(before);
      before = mean(b);
    }
    expect(mean(100.0001) - mean(99.9999)).toBeLessThan(1e-4);
  });
});
