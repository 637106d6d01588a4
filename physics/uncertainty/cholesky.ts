/**
 * Cholesky's decomposition of a symmetric, positive definite matrix A = L Lᵀ (Press et al., Numerical Recipes, 3rd ed.,
 * §2.9).
 */
import { DomainError } from '../errors.ts';

/** A pivot this small beside its diagonal element is one of rounding: the matrix is singular. */
const SMALLEST_PIVOT = 1e-12;

/**
 * L, lower triangular, row by row.
 *
 * @throws DomainError at `parameter` for a matrix that is not square, symmetric (to 1e-9), finite and positive definite
 * @example cholesky([[4, 2], [2, 5]], 'covariance') // [[2, 0], [1, 2]]
 */
export function cholesky(matrix: readonly (readonly number[])[], parameter: string): number[][] {
  const n = matrix.length;
  const refuse = (value: unknown, allowed: string): never => {
    throw new DomainError(parameter, value, allowed);
  };
  const lower = matrix.map(() => new Array<number>(n).fill(0));
  for (let i = 0; i < n; i++) {
    if (matrix[i].length !== n) refuse(matrix[i].length, `a square matrix, ${n} × ${n}`);
    for (let j = 0; j <= i; j++) {
      const [a, mirrored, scale] = [matrix[i][j], matrix[j][i], Math.sqrt(matrix[i][i] * matrix[j][j])];
      if (!(Math.abs(a - mirrored) <= 1e-9 * scale))
        refuse(a, 'a symmetric matrix of finite numbers, its diagonal above 0');
      let rest = a;
      for (let k = 0; k < j; k++) rest -= lower[i][k] * lower[j][k];
      if (i === j) {
        if (!(rest > SMALLEST_PIVOT * a && rest < Infinity)) refuse(a, 'a positive definite matrix');
        lower[i][i] = Math.sqrt(rest);
      } else lower[i][j] = rest / lower[j][j];
    }
  }
  return lower;
}

/** x with L Lᵀ x = b. */
export function choleskySolve(lower: readonly (readonly number[])[], b: readonly number[]): number[] {
  const x = [...b];
  for (let i = 0; i < x.length; i++) {
    for (let k = 0; k < i; k++) x[i] -= lower[i][k] * x[k];
    x[i] /= lower[i][i];
  }
  for (let i = x.length - 1; i >= 0; i--) {
    for (let k = i + 1; k < x.length; k++) x[i] -= lower[k][i] * x[k];
    x[i] /= lower[i][i];
  }
  return x;
}
