import { describe, expect, it } from 'vitest';
import { seededRandom } from '../../../physics/exposure/random.ts';
import { cholesky, choleskySolve } from '../../../physics/uncertainty/cholesky.ts';
import { parameterDraws, standardNormals } from '../../../physics/uncertainty/draws.ts';
import { quantiles, REPORTED_QUANTILES } from '../../../physics/uncertainty/quantiles.ts';
import { varianceShares } from '../../../physics/uncertainty/variance-shares.ts';

const HALO = { means: [238, 544], spread: { standardDeviations: [1.5, 35] } };
const column = (rows: readonly (readonly number[])[], j: number): number[] => rows.map((row) => row[j]);
const mean = (values: readonly number[]): number => values.reduce((a, b) => a + b, 0) / values.length;
const covariance = (a: readonly number[], b: readonly number[]): number =>
  mean(a.map((value, i) => (value - mean(a)) * (b[i] - mean(b))));

describe('cholesky', () => {
  it('gives L of textbook matrices, and L Lᵀ = A; choleskySolve solves A x = b', () => {
    expect(
      cholesky(
        [
          [4, 2],
          [2, 5],
        ],
        'covariance',
      ),
    ).toEqual([
      [2, 0],
      [1, 2],
    ]);
    // the example of the method's article in Wikipedia ("Cholesky decomposition", 2024)
    const a = [
      [4, 12, -16],
      [12, 37, -43],
      [-16, -43, 98],
    ];
    const lower = cholesky(a, 'covariance');
    expect(lower).toEqual([
      [2, 0, 0],
      [6, 1, 0],
      [-8, 5, 3],
    ]);
    const x = [1, -2, 0.5];
    const b = a.map((row) => row.reduce((sum, value, k) => sum + value * x[k], 0));
    choleskySolve(lower, b).forEach((value, i) => {
      expect(value).toBeCloseTo(x[i], 12);
    });
  });

  const refused: [string, number[][]][] = [
    [
      'an indefinite matrix',
      [
        [1, 2],
        [2, 1],
      ],
    ],
    [
      'a singular one',
      [
        [1, 1],
        [1, 1],
      ],
    ],
    [
      'an asymmetric one',
      [
        [2, 1],
        [0, 2],
      ],
    ],
    [
      'a negative variance',
      [
        [-1, 0],
        [0, 1],
      ],
    ],
    [
      'a variance of 0',
      [
        [0, 0],
        [0, 1],
      ],
    ],
    ['one that is not square', [[1, 0]]],
    [
      'one with a NaN',
      [
        [1, Number.NaN],
        [Number.NaN, 1],
      ],
    ],
  ];
  it.each(refused)('refuses %s', (_, matrix) => {
    expect(() => cholesky(matrix, 'covariance')).toThrowError(expect.objectContaining({ parameter: ['covariance'] }));
  });
});

describe('parameterDraws', () => {
  it('are the same for the same seed, others for another, and begin alike when there are more', () => {
    const [a, b] = [1, 2].map(() => parameterDraws(HALO, { draws: 100, seed: 7 }));
    expect(a).toEqual(b);
    expect(parameterDraws(HALO, { draws: 100, seed: 8 }).values[0]).not.toEqual(a.values[0]);
    expect(parameterDraws(HALO, { draws: 200, seed: 7 }).values.slice(0, 100)).toEqual(a.values);
  });

  it('have the mean and covariance asked for, within 4 standard errors', () => {
    const asked = [
      [2.25, 21],
      [21, 1225],
    ];
    const draws = 40_000;
    const { values, redrawn } = parameterDraws(
      { means: [238, 544], spread: { covariance: asked } },
      { draws, seed: 3 },
    );
    expect(redrawn).toBe(0);
    for (const i of [0, 1]) {
      expect(Math.abs(mean(column(values, i)) - HALO.means[i])).toBeLessThan(4 * Math.sqrt(asked[i][i] / draws));
      for (const j of [0, 1]) {
        // variance of a sample covariance: (A_ii A_jj + A_ij²)/n
        const error = Math.sqrt((asked[i][i] * asked[j][j] + asked[i][j] ** 2) / draws);
        expect(Math.abs(covariance(column(values, i), column(values, j)) - asked[i][j])).toBeLessThan(4 * error);
      }
    }
  });

  it('are standard normal: moments 0, 1, 0, 3 within 4 standard errors, pairs uncorrelated', () => {
    const normal = standardNormals(seededRandom(11));
    const z = Array.from({ length: 100_000 }, normal);
    // standard errors of the moments of n normals: √(1, 2, 15, 96)/√n
    for (const [power, expected, variance] of [
      [1, 0, 1],
      [2, 1, 2],
      [3, 0, 15],
      [4, 3, 96],
    ])
      expect(Math.abs(mean(z.map((value) => value ** power)) - expected)).toBeLessThan(
        4 * Math.sqrt(variance / z.length),
      );
    const pairs = z.slice(1).map((value, i) => value * z[i]);
    expect(Math.abs(mean(pairs))).toBeLessThan(4 / Math.sqrt(z.length));
  });

  it('redraws and counts what is not physical: half a Gaussian keeps one draw in two and has the mean √(2/π) σ', () => {
    const draws = 20_000;
    const { values, redrawn } = parameterDraws(
      { means: [0], spread: { standardDeviations: [1] } },
      { draws, seed: 5, isPhysical: ([x]) => x > 0 },
    );
    expect(values.every(([x]) => x > 0)).toBe(true);
    expect(Math.abs(redrawn / draws - 1)).toBeLessThan((4 * Math.SQRT2) / Math.sqrt(draws)); // negative binomial: variance 2n
    expect(Math.abs(mean(column(values, 0)) - Math.sqrt(2 / Math.PI))).toBeLessThan(
      4 * Math.sqrt((1 - 2 / Math.PI) / draws),
    );
  });

  it('refuses spreads that are not above 0, covariances of another size, and parameters that are hardly ever physical', () => {
    const cases: [() => unknown, string][] = [
      [
        () => parameterDraws({ means: [1], spread: { standardDeviations: [0] } }, { draws: 1, seed: 1 }),
        'standardDeviations',
      ],
      [
        () => parameterDraws({ means: [1, 2], spread: { standardDeviations: [1] } }, { draws: 1, seed: 1 }),
        'standardDeviations',
      ],
      [() => parameterDraws({ means: [1, 2], spread: { covariance: [[1]] } }, { draws: 1, seed: 1 }), 'covariance'],
      [() => parameterDraws({ means: [], spread: { standardDeviations: [] } }, { draws: 1, seed: 1 }), 'parameters'],
      [
        () => parameterDraws({ means: [Number.NaN], spread: { standardDeviations: [1] } }, { draws: 1, seed: 1 }),
        'means',
      ],
      [() => parameterDraws(HALO, { draws: 0, seed: 1 }), 'draws'],
      [() => parameterDraws(HALO, { draws: 1, seed: -1 }), 'seed'],
      [() => parameterDraws(HALO, { draws: 10, seed: 1, isPhysical: () => false }), 'parameters'],
    ];
    for (const [of, parameter] of cases) expect(of).toThrowError(expect.objectContaining({ parameter: [parameter] }));
  });
});

describe('quantiles', () => {
  it('interpolates between order statistics (definition 7 of Hyndman & Fan 1996)', () => {
    expect(quantiles([4, 1, 3, 2], [0, 0.25, 0.5, 1])).toEqual([1, 1.75, 2.5, 4]);
    expect(quantiles([9], REPORTED_QUANTILES)).toEqual([9, 9, 9, 9, 9]);
    expect(quantiles([1, 2, Infinity], [0.5, 0.75, 1])).toEqual([2, Infinity, Infinity]);
  });

  it('of a Gaussian are its mean, ±0.994σ (16, 84 %) and ±1.645σ (5, 95 %), within 4 standard errors', () => {
    const n = 100_000;
    const normal = standardNormals(seededRandom(2));
    const of = quantiles(Array.from({ length: n }, normal));
    const z = [-1.64485, -0.99446, 0, 0.99446, 1.64485];
    of.forEach((value, i) => {
      const density = Math.exp(-(z[i] ** 2) / 2) / Math.sqrt(2 * Math.PI);
      const p = REPORTED_QUANTILES[i];
      expect(Math.abs(value - z[i])).toBeLessThan((4 * Math.sqrt((p * (1 - p)) / n)) / density);
    });
  });

  it('refuses no values, NaN and shares outside 0…1', () => {
    expect(() => quantiles([], [0.5])).toThrow(/values/);
    expect(() => quantiles([1, Number.NaN], [0.5])).toThrow(/values/);
    expect(() => quantiles([1], [1.5])).toThrow(/shares/);
  });
});

describe('varianceShares', () => {
  const { values } = parameterDraws(
    { means: [10, 5, 1], spread: { standardDeviations: [1, 2, 0.5] } },
    { draws: 4000, seed: 9 },
  );
  const error = 4 / Math.sqrt(4000);

  it('of a sum are the squares a²σ² of the terms over their sum', () => {
    const { shares, unexplained } = varianceShares(
      values,
      values.map(([x, y]) => 3 * x + 2 * y),
    )!;
    const expected = [9 / 25, 16 / 25, 0];
    shares.forEach((share, j) => {
      expect(Math.abs(share - expected[j])).toBeLessThan(error);
    });
    expect(unexplained).toBeCloseTo(0, 8);
  });

  it('see a parabola that no straight line fits', () => {
    const { shares } = varianceShares(
      values,
      values.map(([x, y]) => (x - 10) ** 2 + 0.1 * y),
    )!;
    // variances 2 and 0.04
    expect(Math.abs(shares[0] - 2 / 2.04)).toBeLessThan(error);
  });

  it('leave an interaction unexplained: x y with means 0 has no first-order share', () => {
    const { unexplained } = varianceShares(
      values,
      values.map(([x, y]) => (x - 10) * (y - 5)),
    )!;
    expect(unexplained).toBeGreaterThan(1 - 2 * error);
  });

  it('of correlated parameters sum to R²; share_j = b_j Cov(x_j, y)/Var(y)', () => {
    const drawn = parameterDraws(
      {
        means: [0, 0],
        spread: {
          covariance: [
            [1, 0.5],
            [0.5, 1],
          ],
        },
      },
      { draws: 4000, seed: 4 },
    ).values;
    const { shares } = varianceShares(
      drawn,
      drawn.map(([x, y]) => x + 2 * y),
    )!;
    // Var = 1 + 4 + 2 · 2 · 0.5 = 7; Cov(x, y_result) = 1 + 1, 2 Cov = 2 (0.5 + 2)
    expect(Math.abs(shares[0] - 2 / 7)).toBeLessThan(error);
    expect(shares[0] + shares[1]).toBeCloseTo(1, 8);
  });

  it('are 0 for what does not vary, and undefined for too few or infinite results', () => {
    expect(
      varianceShares(
        values,
        values.map(() => 0.1),
      ),
    ).toEqual({ shares: [0, 0, 0], unexplained: 0 });
    expect(varianceShares(values.slice(0, 10), new Array(10).fill(1))).toBeUndefined();
    expect(
      varianceShares(
        values,
        values.map((_, i) => (i === 3 ? Infinity : i)),
      ),
    ).toBeUndefined();
    expect(() => varianceShares(values, [1])).toThrow(/results/);
  });
});
