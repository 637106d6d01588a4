/**
 * The likelihood of Poisson counts whose means are linear in a few parameters, maximised over them.
 *
 * Row i has n_i counts at the mean ν_i = n_i + offset_i + Σ_p c_ip v_p, with the parameters v_p ≥ lower_p, all 0 at the reference. What
 * is minimised is half of −2 ln(likelihood/likelihood at ν = n), D(v) = Σ_i [ν_i − n_i − n_i ln(ν_i/n_i)] ≥ 0, which is convex. An
 * auxiliary Poisson measurement is one more row.
 *
 * Newton's method with the step halved until D falls, parameters at their lower bound held there while D rises inwards. The
 * excess ν − n is carried, not ν, so that D keeps its digits when it is tiny. Typed arrays, nothing allocated in a fit.
 */
import { poissonDeviance } from './deviance.ts';

export interface ProfileFit {
  readonly counts: Float64Array;
  readonly offsets: Float64Array;
  /** n + offset, the means at the reference, given too: where the offset is nearly −n, their sum has lost the digits. */
  readonly means: Float64Array;
  /** The best parameters of the last call of `minimise`; its start is what they are set to before. */
  readonly parameters: Float64Array;
  /** Minimises D from `parameters`, to `relativeTolerance` of D. Returns D; ∞ when the start makes something impossible that happened. */
  minimise(relativeTolerance: number): number;
  /** D of the rows from `from` up to, without, `to` at the last minimum. */
  devianceOf(from: number, to: number): number;
}

const LARGEST_STEPS = 100;
const LARGEST_HALVINGS = 40;
/** Curvature an empty row is given, relative to its mean, so that the Newton matrix stays positive. */
const CURVATURE_FLOOR = 1e-9;

/**
 * @param coefficients c_ip ≥ 0, one array over the rows for each parameter; the rows' number is `rows`.
 * @param lower bounds of the parameters, ≤ 0.
 */
export function profileFit(rows: number, coefficients: readonly Float64Array[], lower: readonly number[]): ProfileFit {
  const size = coefficients.length;
  const counts = new Float64Array(rows);
  const offsets = new Float64Array(rows);
  const means = new Float64Array(rows);
  const excess = new Float64Array(rows);
  const trialExcess = new Float64Array(rows);
  const mean = new Float64Array(rows);
  const trialMean = new Float64Array(rows);
  const parameters = new Float64Array(size);
  const trial = new Float64Array(size);
  const gradient = new Float64Array(size);
  const step = new Float64Array(size);
  const matrix = new Float64Array(size * size);
  const weights = new Float64Array(rows);
  const weighted = new Float64Array(rows);
  const pulls = new Float64Array(rows);

  /** Fills in ν − n and ν at `at`; returns D. */
  function devianceAt(at: Float64Array, intoExcess: Float64Array, intoMean: Float64Array): number {
    intoExcess.set(offsets);
    intoMean.set(means);
    for (let p = 0; p < size; p++) {
      const c = coefficients[p];
      const v = at[p];
      for (let i = 0; i < rows; i++) {
        const change = c[i] * v;
        intoExcess[i] += change;
        intoMean[i] += change;
      }
    }
    let sum = 0;
    for (let i = 0; i < rows; i++) {
      if (counts[i] > 0 && !(intoMean[i] > 0)) return Infinity;
      sum += poissonDeviance(counts[i], intoExcess[i], intoMean[i]);
    }
    return sum;
  }

  /** Gradient g_p = Σ_i c_ip (1 − n_i/ν_i) and lower triangle of the Hessian Σ_i c_ip c_iq n_i/ν_i². */
  function differentiate(): void {
    for (let i = 0; i < rows; i++) {
      const nu = mean[i];
      weights[i] = nu > 0 ? (counts[i] / nu + CURVATURE_FLOOR) / nu : 0;
      pulls[i] = nu > 0 ? excess[i] / nu : 1;
    }
    for (let p = 0; p < size; p++) {
      const c = coefficients[p];
      let slope = 0;
      for (let i = 0; i < rows; i++) {
        slope += c[i] * pulls[i];
        weighted[i] = c[i] * weights[i];
      }
      gradient[p] = slope;
      for (let q = 0; q <= p; q++) {
        const d = coefficients[q];
        let sum = 0;
        for (let i = 0; i < rows; i++) sum += weighted[i] * d[i];
        matrix[p * size + q] = sum;
      }
    }
  }

  /** Takes a parameter that its bound holds out of the linear system. */
  function holdAtBounds(): void {
    for (let p = 0; p < size; p++) {
      const isHeld = parameters[p] <= lower[p] && gradient[p] > 0;
      if (!isHeld && matrix[p * size + p] > 0) continue;
      gradient[p] = 0;
      for (let q = 0; q < p; q++) matrix[p * size + q] = 0;
      for (let q = p + 1; q < size; q++) matrix[q * size + p] = 0;
      matrix[p * size + p] = 1;
    }
  }

  /** The largest share of the step, up to 1, that no bound forbids. */
  function shareWithinBounds(): number {
    let share = 1;
    for (let p = 0; p < size; p++) {
      if (step[p] < 0) share = Math.min(share, (lower[p] - parameters[p]) / step[p]);
    }
    return share;
  }

  function moveTo(share: number): void {
    for (let p = 0; p < size; p++) trial[p] = Math.max(lower[p], parameters[p] + share * step[p]);
  }

  function minimise(relativeTolerance: number): number {
    let deviance = devianceAt(parameters, excess, mean);
    for (let iteration = 0; iteration < LARGEST_STEPS; iteration++) {
      differentiate();
      holdAtBounds();
      const decrease = newtonStep(matrix, gradient, step);
      if (!(decrease > relativeTolerance * deviance)) break;
      let share = shareWithinBounds();
      let reached = Infinity;
      for (let halving = 0; halving < LARGEST_HALVINGS; halving++) {
        moveTo(share);
        reached = devianceAt(trial, trialExcess, trialMean);
        if (reached < deviance) break;
        share /= 2;
      }
      if (!(reached < deviance)) break;
      deviance = reached;
      parameters.set(trial);
      excess.set(trialExcess);
      mean.set(trialMean);
    }
    return deviance;
  }

  function devianceOf(from: number, to: number): number {
    let sum = 0;
    for (let i = from; i < to; i++) sum += poissonDeviance(counts[i], excess[i], mean[i]);
    return sum;
  }

  return { counts, offsets, means, parameters, minimise, devianceOf };
}

/**
 * Solves matrix × step = −gradient by Cholesky's decomposition, in place (lower triangle, row by row), and returns
 * −gradient · step, twice the decrease that the quadratic model promises. A pivot lost to rounding is replaced by a tiny one.
 */
function newtonStep(matrix: Float64Array, gradient: Float64Array, step: Float64Array): number {
  const size = gradient.length;
  for (let p = 0; p < size; p++) {
    for (let q = 0; q <= p; q++) {
      let sum = matrix[p * size + q];
      for (let k = 0; k < q; k++) sum -= matrix[p * size + k] * matrix[q * size + k];
      if (q < p) matrix[p * size + q] = sum / matrix[q * size + q];
      else matrix[p * size + p] = Math.sqrt(Math.max(sum, 1e-14 * matrix[p * size + p]));
    }
  }
  let decrease = 0;
  for (let p = 0; p < size; p++) {
    let sum = -gradient[p];
    for (let k = 0; k < p; k++) sum -= matrix[p * size + k] * step[k];
    step[p] = sum / matrix[p * size + p];
    decrease += step[p] * step[p];
  }
  for (let p = size - 1; p >= 0; p--) {
    let sum = step[p];
    for (let k = p + 1; k < size; k++) sum -= matrix[k * size + p] * step[k];
    step[p] = sum / matrix[p * size + p];
  }
  return decrease;
}
