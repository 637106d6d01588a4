import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { responseMatrix, truncationElectron } from '../../../physics/detector/noise-response.ts';
import { readoutResponse } from '../../../physics/detector/readout.ts';
import { DomainError } from '../../../physics/errors.ts';
import { normalBetween } from '../../../physics/numeric/gaussian-cells.ts';

const sum = (values: ArrayLike<number>): number => Array.from(values).reduce((a, b) => a + b, 0);
const noise = fc.double({ min: 0, max: 20, noNaN: true });
const electrons = fc.integer({ min: 1, max: 30 });

function refusedAt(call: () => unknown): string {
  try {
    call();
  } catch (error) {
    if (error instanceof DomainError) return error.parameter.join('/');
  }
  return 'not refused';
}

describe('responseMatrix', () => {
  it('rows sum to 1, whatever the noise', () => {
    fc.assert(
      fc.property(noise, electrons, (sigma, max) => {
        for (const row of responseMatrix(sigma, max, max + 5)) expect(Math.abs(sum(row) - 1)).toBeLessThan(3e-15);
      }),
      { numRuns: 200, seed: 1 },
    );
  });

  it('without noise is the identity, exactly; so it is for a noise next to nothing', () => {
    for (const sigma of [0, 5e-324, 1e-9, 0.01]) {
      responseMatrix(sigma, 4, 6).forEach((row, k) => {
        expect([...row]).toEqual([0, 1, 2, 3, 4, 5].map((n) => (n === Math.min(k, 5) ? 1 : 0)));
      });
    }
  });

  it('reads the cells of the normal distribution, 0 taking all below and the last column all above', () => {
    const matrix = responseMatrix(0.16, 3, 4);
    // cells at σ = 0.16: 40 digits with a general-purpose multiprecision library
    expect(matrix[0][1]).toBeCloseTo(0.000889025299108432, 17);
    expect(matrix[2][1]).toBeCloseTo(0.000889025299108432, 17);
    expect(matrix[0][3] / 2.45960804336845e-55).toBeCloseTo(1, 12);
    expect(matrix[1][0]).toBe(normalBetween(-Infinity, -0.5 / 0.16));
    expect(matrix[0][0]).toBe(normalBetween(-Infinity, 0.5 / 0.16));
    expect(matrix[4][4]).toBe(normalBetween(-0.5 / 0.16, Infinity));
  });
});

describe('truncationElectron', () => {
  it('is maxElectrons without noise and grows with it', () => {
    expect(truncationElectron(0, 12)).toBe(12);
    expect(truncationElectron(0.08, 12)).toBe(12); // Φ(−½/0.08) = 2e-10
    expect(truncationElectron(0.16, 12)).toBe(13); // Φ(−½/0.16) = 9e-4, Φ(−3/2/0.16) = 4e-21
  });

  it('is the first beyond which less than 1e-9 returns', () => {
    const returnedBeyond = (sigma: number, max: number, last: number): number => {
      let total = 0;
      for (let k = last + 1; k < last + 1000; k++) total += normalBetween(-Infinity, (max + 0.5 - k) / sigma);
      return total;
    };
    fc.assert(
      fc.property(fc.double({ min: 1e-3, max: 20, noNaN: true }), electrons, (sigma, max) => {
        const last = truncationElectron(sigma, max);
        expect(returnedBeyond(sigma, max, last)).toBeLessThan(1e-9);
        if (last > max) expect(returnedBeyond(sigma, max, last - 1)).toBeGreaterThanOrEqual(1e-9);
      }),
      { numRuns: 200, seed: 2 },
    );
  });

  it('following ten more electrons changes no measured bin of a flat true spectrum by 1e-9', () => {
    const last = truncationElectron(1.3, 8);
    const [short, long] = [last, last + 10].map((k) => responseMatrix(1.3, 8, k));
    for (let n = 0; n <= 8; n++) {
      const bin = (matrix: Float64Array[]): number => matrix.reduce((total, row) => total + row[n], 0);
      expect(Math.abs(bin(long) - bin(short))).toBeLessThan(1e-9);
    }
  });
});

describe('readoutResponse', () => {
  it('conserves the total rate at efficiency 1', () => {
    fc.assert(
      fc.property(noise, electrons, fc.integer({ min: 0, max: 1000 }), (noiseElectrons, maxElectrons, seed) => {
        const response = readoutResponse({ noiseElectrons, efficiency: 1, maxElectrons });
        const rates = Array.from({ length: response.lastElectron + 1 }, (_, k) => 1 + (((k + 1) * (seed + 7)) % 101));
        const { bins, above } = response.apply(rates);
        expect(Math.abs((sum(bins) + above) / sum(rates) - 1)).toBeLessThan(1e-13);
      }),
      { numRuns: 200, seed: 3 },
    );
  });

  it('without noise gives the true rates back, digit for digit', () => {
    const rates = [0, 0.1, 1 / 3, 7e9, 1e-300];
    const { bins, above } = readoutResponse({ noiseElectrons: 0, efficiency: 1, maxElectrons: 4 }).apply(rates);
    expect([...bins]).toEqual(rates);
    expect(above).toBe(0);
  });

  it('multiplies by the efficiency after the noise', () => {
    const efficiency = [0, 0.1, 0.2, 0.3];
    const rates = [5, 4, 3, 2];
    const full = readoutResponse({ noiseElectrons: 0.4, efficiency: 1, maxElectrons: 3 }).apply(rates);
    const cut = readoutResponse({ noiseElectrons: 0.4, efficiency, maxElectrons: 3 }).apply(rates);
    expect([...cut.bins]).toEqual([...full.bins].map((rate, n) => rate * efficiency[n]));
    expect(cut.above).toBe(full.above);
  });

  it('takes fewer rates than it follows, not more', () => {
    const response = readoutResponse({ noiseElectrons: 0, efficiency: 0.5, maxElectrons: 2 });
    expect([...response.apply([0, 2]).bins]).toEqual([0, 1, 0]);
    expect(refusedAt(() => response.apply([0, 0, 0, 1]))).toBe('trueRates');
  });

  it.each([
    [{ noiseElectrons: -0.1 }, 'noise'],
    [{ noiseElectrons: Number.NaN }, 'noise'],
    [{ noiseElectrons: 101 }, 'noise'],
    [{ efficiency: 1.01 }, 'efficiency'],
    [{ efficiency: Number.NaN }, 'efficiency'],
    [{ efficiency: [1, 1] }, 'efficiency'],
    [{ efficiency: [1, 1, -0.1, 1] }, 'efficiency/2'],
    [{ maxElectrons: 0 }, 'maxElectrons'],
    [{ maxElectrons: 1.5 }, 'maxElectrons'],
  ])('%j is refused at %s', (change, path) => {
    const call = () => readoutResponse({ noiseElectrons: 0.1, efficiency: 1, maxElectrons: 3, ...change });
    expect(refusedAt(call)).toBe(path);
  });
});
