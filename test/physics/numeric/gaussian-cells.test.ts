import { describe, expect, it } from 'vitest';
import { gaussianCells, normalBetween } from '../../../physics/numeric/gaussian-cells.ts';

describe('gaussianCells', () => {
  // mean, deviation, n, ∫ of the normal density over the cell: 40 digits (quadrature; the last from tails) with a general-purpose
  // multiprecision library
  const cells: readonly (readonly [number, number, number, number])[] = [
    [0, 0.16, 0, 0.9982219494017831],
    [0, 0.16, 1, 0.000889025299108432],
    [2, 0.16, 1, 0.000889025299108432],
    [7.3, 0.9, 12, 1.5268420520394129e-6],
    [7.3, 0.9, 1, 5.7991457985082276e-11],
    [20, 6, 20, 0.0664135037052446],
    [0, 0.16, 3, 2.45960804336845e-55],
  ];

  it('is the integral over each cell, far tails included', () => {
    const out = new Float64Array(30);
    for (const [mean, deviation, n, expected] of cells) {
      gaussianCells(mean, deviation, 0, out);
      expect(Math.abs(out[n] / expected - 1)).toBeLessThan(1e-13);
    }
    expect(cells.length).toBe(7);
  });

  it('adds up to the probability of the whole range', () => {
    for (const deviation of [1e-9, 0.2, 3, 40]) {
      const out = new Float64Array(50);
      gaussianCells(17.25, deviation, 3, out);
      const whole = normalBetween((2.5 - 17.25) / deviation, (52.5 - 17.25) / deviation);
      expect(Math.abs(out.reduce((a, b) => a + b) - whole)).toBeLessThan(2e-15);
    }
  });

  it('writes no further than it is told', () => {
    const out = new Float64Array(5).fill(-1);
    gaussianCells(1, 1, 1, out, 2);
    expect([...out.subarray(2)]).toEqual([-1, -1, -1]);
  });
});

describe('normalBetween', () => {
  it('takes infinite ends', () => {
    expect(normalBetween(-Infinity, Infinity)).toBe(1);
    expect(normalBetween(0, Infinity)).toBe(0.5);
    expect(normalBetween(-Infinity, 0)).toBe(0.5);
  });
});
