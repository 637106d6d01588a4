import { describe, expect, it } from 'vitest';
import { kramersKronig, staticKramersKronig } from '../../../physics/crystal/kramers-kronig.ts';
import { gaussLegendre } from '../../../physics/numeric/gauss-legendre.ts';
import { growingAxis, oscillator } from '../../support/dielectric-models.ts';

/** A triangle of height 1 on [5, 15] eV. */
const triangle = (e: number): number => Math.max(0, 1 - Math.abs(e - 10) / 5);

/** (2/π) P∫ by subtraction of the pole, with Gauss–Legendre between the kinks: another method. */
function subtracted(g: (e: number) => number, breaks: readonly number[], at: number): number {
  const rule = gaussLegendre(32);
  let sum = 0;
  const pieces = [...new Set([0, ...breaks, at, 30])].sort((a, b) => a - b);
  for (let i = 1; i < pieces.length; i++) {
    const [a, b] = [pieces[i - 1], pieces[i]];
    rule.nodes.forEach((node, k) => {
      const e = (a + b) / 2 + ((b - a) / 2) * node;
      sum += ((rule.weights[k] * (b - a)) / 2) * ((e * g(e) - at * g(at)) / (e * e - at * at));
    });
  }
  const [first, last] = [pieces[0], pieces[pieces.length - 1]];
  const pole = (e: number): number => Math.log(Math.abs((e - at) / (e + at))) / 2;
  return (2 / Math.PI) * (sum + g(at) * (pole(last) - pole(first)));
}

describe('kramersKronig', () => {
  it('of a triangle between points: (2/π)(3 ln 1.5 − ln 2) at E = 0 by hand, principal values by subtraction elsewhere', () => {
    const energyEv = Float64Array.from([0, 2, 5, 7, 10, 12, 15, 20]);
    const values = energyEv.map(triangle);
    const k = kramersKronig('points', energyEv, values, 1);
    expect(k[0]).toBeCloseTo((2 / Math.PI) * (3 * Math.log(1.5) - Math.LN2), 13);
    expect(staticKramersKronig('points', energyEv, values, 1)[0]).toBeCloseTo(k[0], 13);
    let compared = 0;
    for (const j of [1, 3, 4, 5, 7]) {
      expect(k[j], `${energyEv[j]} eV`).toBeCloseTo(subtracted(triangle, [5, 10, 15], energyEv[j]), 12);
      compared++;
    }
    expect(compared).toBe(5);
  });

  it('of a constant on cells [4, 6] and [6, 9]: subtraction at the middles, two rows at once', () => {
    const energyEv = Float64Array.from([2, 4, 6, 9, 11]);
    const k = kramersKronig('edges', energyEv, Float64Array.from([0, 3, 3, 0, 0, 6, 6, 0]), 2);
    const box = (e: number): number => (e > 4 && e < 9 ? 3 : 0);
    for (const [j, e] of [3, 5, 7.5, 10].entries()) {
      expect(k[j], `${e} eV`).toBeCloseTo(subtracted(box, [4, 9], e), 12);
      expect(k[4 + j]).toBeCloseTo(2 * k[j], 13);
    }
    expect(staticKramersKronig('edges', energyEv, Float64Array.from([0, 3, 3, 0]), 1)[0]).toBeCloseTo(
      (6 / Math.PI) * Math.log(9 / 4),
      13,
    );
  });

  // the exact K of a staircase differs from that of a smooth g in first order of the step, that of a polygon in second order
  it.each([
    ['edges', 1.9, 1.2],
    ['points', 3.6, 0.12],
  ] as const)(
    "of Lorentz's Im ε is its Re ε − 1, %s: twice the cells, an error %s times smaller",
    (axes, ratio, largest) => {
      const model = oscillator(16.6, 4.3, 1);
      const errorOf = (cells: number): number => {
        const energyEv = growingAxis(4000, cells, 8);
        const middles = axes === 'edges' ? energyEv.subarray(1).map((e, i) => (e + energyEv[i]) / 2) : energyEv;
        const k = kramersKronig(axes, energyEv, middles.map(model.imaginary), 1);
        return Math.max(...middles.map((e, j) => (e < 40 ? Math.abs(k[j] - model.real(e) + 1) : 0)));
      };
      const [coarse, fine] = [errorOf(400), errorOf(800)];
      expect(fine).toBeLessThan(coarse / ratio);
      expect(fine).toBeLessThan(largest); // Re ε runs from −30 to 40
    },
  );
});
