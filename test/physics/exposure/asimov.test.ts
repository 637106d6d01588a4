import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { type AsimovTest, asimovDeviance, type BinnedBackground } from '../../../physics/exposure/asimov.ts';

function background(perBin: readonly number[], relativeUncertainty = 0): BinnedBackground {
  return { name: 'background', perBin, relativeUncertainty };
}

function z(test: AsimovTest, signal: readonly number[], backgrounds: readonly BinnedBackground[]): number {
  return Math.sqrt(asimovDeviance(test, signal, backgrounds)(1).q);
}

/** Li & Ma's form of the discovery Z with a background known to v = (r b)² (Cowan et al. 2011 and the on/off problem). */
function onOffDiscovery(s: number, b: number, r: number): number {
  const v = (r * b) ** 2;
  const n = s + b;
  return Math.sqrt(
    2 * (n * Math.log((n * (b + v)) / (b * b + n * v)) - ((b * b) / v) * Math.log(1 + (v * s) / (b * (b + v)))),
  );
}

/** q by brute force: coordinate-wise golden-section search of the likelihood, written out anew, over every multiplier. */
function bruteForce(test: AsimovTest, signal: readonly number[], backgrounds: readonly BinnedBackground[]): number {
  const theta = backgrounds.map(() => 1);
  const data = signal.map((s, i) => (test === 'discovery' ? s : 0) + backgrounds.reduce((t, b) => t + b.perBin[i], 0));
  const minusTwoLn = (): number => {
    let sum = 0;
    signal.forEach((s, i) => {
      const mean = (test === 'exclusion' ? s : 0) + backgrounds.reduce((t, b, j) => t + theta[j] * b.perBin[i], 0);
      sum += 2 * (mean - data[i] + (data[i] > 0 ? data[i] * Math.log(data[i] / mean) : 0));
    });
    backgrounds.forEach((b, j) => {
      if (b.relativeUncertainty > 0) sum += (2 / b.relativeUncertainty ** 2) * (theta[j] - 1 - Math.log(theta[j]));
    });
    return sum;
  };
  const golden = (Math.sqrt(5) - 1) / 2;
  for (let round = 0; round < 400; round++) {
    backgrounds.forEach((b, j) => {
      if (b.relativeUncertainty === 0) return;
      let [low, high] = [theta[j] / 2, theta[j] * 2];
      while (high - low > 1e-9) {
        const [left, right] = [high - golden * (high - low), low + golden * (high - low)];
        theta[j] = left;
        const atLeft = minusTwoLn();
        theta[j] = right;
        if (atLeft < minusTwoLn()) high = right;
        else low = left;
      }
      theta[j] = (low + high) / 2;
    });
  }
  return minusTwoLn();
}

const rates = fc.double({ min: 0.01, max: 50, noNaN: true });
const bins = (count: number) => fc.array(rates, { minLength: count, maxLength: count });

describe('asimovDeviance', () => {
  it.each([
    { s: 10, b: 9, discovery: 2.8973 },
    { s: 5, b: 1, discovery: 3.3913 },
  ])(
    'for discovery of $s above $b gives $discovery σ (Cowan et al., Z² = 2[(s+b) ln(1+s/b) − s])',
    ({ s, b, discovery }) => {
      expect(Math.abs(z('discovery', [s], [background([b])]) - discovery)).toBeLessThan(5e-5);
    },
  );

  it('for exclusion is √(2[s − b ln(1 + s/b)]) with a known background', () => {
    const expected = Math.sqrt(2 * (10 - 9 * Math.log(1 + 10 / 9)));
    expect(z('exclusion', [10], [background([9])])).toBeCloseTo(expected, 12);
  });

  it('for exclusion without background is √(2s), for discovery unbounded', () => {
    expect(z('exclusion', [3], [])).toBeCloseTo(Math.sqrt(6), 13);
    expect(z('discovery', [3], [])).toBe(Infinity);
  });

  it('for one bin with an uncertain background is the closed profile form (Li & Ma; Cowan et al.), to 1e-10', () => {
    let compared = 0;
    for (const r of [0.01, 0.1, 0.5, 2]) {
      for (const [s, b] of [
        [10, 9],
        [5, 1],
        [40, 300],
        [3, 0.01],
      ]) {
        expect(Math.abs(z('discovery', [s], [background([b], r)]) / onOffDiscovery(s, b, r) - 1)).toBeLessThan(1e-10);
        compared++;
      }
    }
    expect(compared).toBe(16);
  });

  it('is the brute-force maximum of the likelihood, to 1e-7', () => {
    const signal = [3, 2, 1, 0.5];
    const backgrounds = [background([5, 3, 2, 1], 0.2), background([0.5, 1, 2, 4], 0.4), background([1, 1, 1, 1])];
    for (const test of ['discovery', 'exclusion'] as const) {
      const { q } = asimovDeviance(test, signal, backgrounds)(1);
      expect(Math.abs(q / bruteForce(test, signal, backgrounds) - 1)).toBeLessThan(1e-7);
    }
  });

  it('tends to the known background as r → 0', () => {
    for (const test of ['discovery', 'exclusion'] as const) {
      const known = z(test, [4, 2], [background([6, 9])]);
      const nearly = z(test, [4, 2], [background([6, 9], 1e-5)]);
      expect(Math.abs(nearly / known - 1)).toBeLessThan(1e-8);
    }
  });

  it('is unchanged when a bin is split into two halves', () => {
    fc.assert(
      fc.property(bins(3), bins(3), bins(3), fc.constantFrom<AsimovTest>('discovery', 'exclusion'), (s, b, c, test) => {
        const split = (values: number[]): number[] => [...values.slice(0, 2), values[2] / 2, values[2] / 2];
        const whole = z(test, s, [background(b, 0.3), background(c, 0.1)]);
        const halves = z(test, split(s), [background(split(b), 0.3), background(split(c), 0.1)]);
        expect(Math.abs(halves / whole - 1)).toBeLessThan(1e-9);
      }),
      { numRuns: 100, seed: 1 },
    );
  });

  it('falls with background and with its uncertainty', () => {
    fc.assert(
      fc.property(bins(3), bins(3), bins(3), fc.constantFrom<AsimovTest>('discovery', 'exclusion'), (s, b, c, test) => {
        const less = z(test, s, [background(b, 0.1)]);
        expect(z(test, s, [background(b, 0.1), background(c, 0.2)])).toBeLessThanOrEqual(less * (1 + 1e-10));
        expect(z(test, s, [background(b, 0.2)])).toBeLessThanOrEqual(less * (1 + 1e-10));
      }),
      { numRuns: 100, seed: 1 },
    );
  });

  it('names its slope: the bins’ part is dq/d ln(exposure)', () => {
    const deviance = asimovDeviance('discovery', [3, 1], [background([5, 2], 0.2), background([1, 4], 0.1)]);
    const h = 1e-4;
    const slope = (deviance(2 * Math.exp(h)).q - deviance(2 * Math.exp(-h)).q) / (2 * h);
    expect(Math.abs(deviance(2).qOfBins / slope - 1)).toBeLessThan(1e-6);
  });

  it('refuses negative rates and lists of different lengths, naming them', () => {
    const fault = (run: () => unknown): readonly (string | number)[] => {
      try {
        run();
      } catch (error) {
        if (error instanceof DomainError) return error.parameter;
      }
      return [];
    };
    expect(fault(() => asimovDeviance('discovery', [1, -1], []))).toEqual(['signal', 1]);
    expect(fault(() => asimovDeviance('discovery', [1], [background([1, 2])]))).toEqual(['backgrounds', 0, 'perBin']);
    expect(fault(() => asimovDeviance('discovery', [1], [background([1], -0.1)]))).toEqual([
      'backgrounds',
      0,
      'relativeUncertainty',
    ]);
  });
});
