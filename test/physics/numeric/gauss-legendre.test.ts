import { describe, expect, it } from 'vitest';
import { gaussLegendre } from '../../../physics/numeric/gauss-legendre.ts';

describe('gaussLegendre', () => {
  it('has the nodes and weights of Abramowitz & Stegun, table 25.4', () => {
    const three = gaussLegendre(3);
    [-Math.sqrt(0.6), 0, Math.sqrt(0.6)].forEach((x, i) => expect(three.nodes[i]).toBeCloseTo(x, 15));
    [5 / 9, 8 / 9, 5 / 9].forEach((w, i) => expect(three.weights[i]).toBeCloseTo(w, 15));
    const ten = gaussLegendre(10);
    expect(ten.nodes[9]).toBeCloseTo(0.973906528517172, 14);
    expect(ten.weights[9]).toBeCloseTo(0.066671344308688, 14);
  });

  it('integrates powers up to 2n − 1 exactly, and not the next', () => {
    for (const n of [1, 2, 3, 5, 14, 16, 64]) {
      const { nodes, weights } = gaussLegendre(n);
      const integral = (power: number): number => nodes.reduce((sum, x, i) => sum + weights[i] * x ** power, 0);
      for (const power of [0, 2, 2 * n - 2].filter((p) => p < 2 * n))
        expect(integral(power)).toBeCloseTo(2 / (power + 1), 12);
      if (n <= 5) expect(Math.abs(integral(2 * n) - 2 / (2 * n + 1))).toBeGreaterThan(1e-5);
    }
  });
});
