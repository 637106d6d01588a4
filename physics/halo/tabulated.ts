/**
 * Halos given as tables: a speed distribution F(v), ∫ F dv = 1, in the galactic frame (isotropic there) or in the
 * laboratory, or the mean inverse speed η(v_min) itself. Straight between the points, nothing outside; a table is divided
 * by its integral.
 *
 *   laboratory frame   η(v) = P(v),   P(t) = ∫_t^∞ F(u)/u du
 *   galactic frame     a shell of speed u has laboratory speeds w from |u − V| to u + V with density w/(2uV), so that
 *                      η(v) = [Q(v − V) − Q(v + V)]/(2V),   Q(t) = ∫_t^∞ P(s) ds = ∫_t^∞ (u − t) F(u)/u du,
 *                      Q(−t) = 2 Q(0) − Q(t), and P(v) for V → 0
 *
 * P and Q are exact for the straight pieces (logarithms), a short stretch by Gauss–Legendre quadrature, which does not
 * cancel.
 */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import { DomainError, requireNonNegative } from '../errors.ts';
import { gaussLegendre } from '../numeric/gauss-legendre.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

export interface SpeedTable {
  /** Strictly increasing, ≥ 0, below the speed of light, km/s; two or more. */
  readonly speedsKmPerS: ArrayLike<number>;
  /** F in any unit, or η; finite, ≥ 0. */
  readonly values: ArrayLike<number>;
}

/**
 * A table's halo, and the integral by which its values were divided: 1 for a table in 1/(km/s) (of η: s/km) that is
 * normalised.
 */
export interface TabulatedHalo extends VelocityDistribution {
  readonly normalisation: number;
}

/**
 * Below this laboratory speed, km/s, η in the galactic frame is P itself: Q's difference would lose more digits than that
 * neglects.
 */
const AT_REST_KM_PER_S = 1e-5;
/** A stretch whose ends are this close in ratio is done by quadrature, a longer one by logarithms. */
const SHORT_RATIO = 1.3;
const RULE = gaussLegendre(6);

function checkedTable({ speedsKmPerS, values }: SpeedTable): { v: Float64Array; f: Float64Array } {
  const v = Float64Array.from(speedsKmPerS);
  const f = Float64Array.from(values);
  if (v.length < 2) throw new DomainError('speeds', v.length, 'at least two speeds');
  if (f.length !== v.length) throw new DomainError('values', f.length, `as many values as speeds, ${v.length}`);
  for (let i = 0; i < v.length; i++) {
    requireNonNegative('values', f[i]);
    if (!(v[i] >= 0 && v[i] < SPEED_OF_LIGHT_KM_PER_S))
      throw new DomainError(['speeds', i], v[i], 'at least 0 and below the speed of light');
    if (i > 0 && !(v[i] > v[i - 1])) throw new DomainError(['speeds', i], v[i], 'above the speed before it');
  }
  return { v, f };
}

/** The points up to the first of the zeros at the end, which say only that nothing is there. */
function lastPoint(f: Float64Array): number {
  let last = f.length - 1;
  while (last > 0 && f[last] === 0 && f[last - 1] === 0) last--;
  return last;
}

function requireIntegral(integral: number): number {
  if (!(integral > 0 && integral < Infinity))
    throw new DomainError('values', integral, 'values whose integral over speed is finite and above 0');
  return integral;
}

/** The interval that holds x, by bisection; the first or last for an x outside. */
function intervalBelow(v: Float64Array, x: number): number {
  let [low, high] = [0, v.length - 1];
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (v[middle] <= x) low = middle;
    else high = middle;
  }
  return low;
}

/** P and Q of a table, normalised. */
interface SpeedIntegrals {
  readonly firstKmPerS: number;
  readonly lastKmPerS: number;
  readonly normalisation: number;
  /** Whether F jumps to a value above 0 at its first point. */
  readonly startsWithJump: boolean;
  inverseSpeedTail(t: number): number;
  secondTail(t: number): number;
}

/** ∫_a^b F(u)/u du and ∫_a^b (u − a) F(u)/u du for F straight, F(a) = fa, F(b) = fb. */
function stretchIntegrals(a: number, b: number, fa: number, fb: number): readonly [number, number] {
  const slope = (fb - fa) / (b - a);
  if (b > SHORT_RATIO * a) {
    const atZero = fa - slope * a;
    if (a === 0) return [slope * (b - a), (b - a) * ((fa + fb) / 2)]; // F(0) = 0, or only the second is asked for
    const log = atZero * Math.log(b / a);
    const first = log + slope * (b - a);
    return [first, (b - a) * ((fa + fb) / 2) - a * first];
  }
  let [first, second] = [0, 0];
  for (let k = 0; k < RULE.nodes.length; k++) {
    const x = ((b - a) / 2) * (1 + RULE.nodes[k]);
    const term = (RULE.weights[k] * (b - a) * (fa + slope * x)) / (2 * (a + x));
    first += term;
    second += term * x;
  }
  return [first, second];
}

function speedIntegrals(table: SpeedTable): SpeedIntegrals {
  const { v, f } = checkedTable(table);
  const last = lastPoint(f);
  const [p, q] = [new Float64Array(last + 1), new Float64Array(last + 1)];
  let norm = 0;
  for (let i = last - 1; i >= 0; i--) {
    const [first, second] = stretchIntegrals(v[i], v[i + 1], f[i], f[i + 1]);
    p[i] = p[i + 1] + first;
    q[i] = q[i + 1] + (v[i + 1] - v[i]) * p[i + 1] + second;
    norm += ((v[i + 1] - v[i]) * (f[i] + f[i + 1])) / 2;
  }
  requireIntegral(norm);
  const speeds = v.subarray(0, last + 1);
  const stretchFrom = (t: number): readonly [i: number, first: number, second: number] => {
    const i = intervalBelow(speeds, t);
    const ft = f[i] + ((f[i + 1] - f[i]) * (t - v[i])) / (v[i + 1] - v[i]);
    return [i, ...stretchIntegrals(t, v[i + 1], ft, f[i + 1])];
  };
  return {
    firstKmPerS: v[0],
    lastKmPerS: v[last],
    normalisation: norm,
    startsWithJump: v[0] > 0 && f[0] > 0,
    inverseSpeedTail(t) {
      if (t >= v[last]) return 0;
      if (t <= v[0]) return p[0] / norm;
      const [i, first] = stretchFrom(t);
      return (p[i + 1] + first) / norm;
    },
    secondTail(t) {
      if (t >= v[last]) return 0;
      if (t <= v[0]) return (q[0] + (v[0] - t) * p[0]) / norm;
      const [i, , second] = stretchFrom(t);
      return (q[i + 1] + (v[i + 1] - t) * p[i + 1] + second) / norm;
    },
  };
}

/** ⟨1/v⟩ is finite only if nothing is left at v = 0. */
function requireNothingAtZero({ speedsKmPerS, values }: SpeedTable): void {
  if (speedsKmPerS[0] === 0 && values[0] > 0)
    throw new DomainError(['values', 0], values[0], '0 at speed 0, where a speed distribution vanishes');
}

/** Speeds, ascending and without repetition, strictly inside the halo's range. */
function kinksInside(speeds: readonly number[], largest: number): number[] {
  return [...new Set(speeds)].filter((v) => v > 0 && v < largest).sort((a, b) => a - b);
}

/**
 * From F(v) in the galactic frame, isotropic there, seen at the laboratory's speed V (km/s, ≥ 0).
 *
 * Accuracy: exact for the straight pieces to 1e-10; a standard halo in 2,000 points comes back to 1e-5, measured 1e-6
 * (test/physics/halo/tabulated.test.ts).
 *
 * @throws DomainError for speeds that do not ascend or reach c, values that are negative or not finite, above 0 at speed
 *   0, or whose integral is 0; a laboratory speed outside its domain
 */
export function tabulatedGalacticHalo(table: SpeedTable, laboratorySpeedKmPerS: number): TabulatedHalo {
  const V = laboratorySpeedKmPerS;
  requireNonNegative('laboratorySpeed', V);
  if (V >= SPEED_OF_LIGHT_KM_PER_S) throw new DomainError('laboratorySpeed', V, 'below the speed of light');
  if (V < AT_REST_KM_PER_S) return { ...tabulatedLaboratoryHalo(table) };
  const integrals = speedIntegrals(table);
  requireNothingAtZero(table);
  const { firstKmPerS: first, lastKmPerS: last, secondTail } = integrals;
  const largestSpeedKmPerS = last + V;
  const centre = secondTail(0);
  const ends = [...(integrals.startsWithJump ? [first + V, Math.abs(first - V)] : []), Math.abs(last - V)];
  return {
    largestSpeedKmPerS,
    kinksKmPerS: kinksInside(ends, largestSpeedKmPerS),
    normalisation: integrals.normalisation,
    meanInverseSpeed(v) {
      if (v >= largestSpeedKmPerS) return 0;
      const below = v >= V ? secondTail(v - V) : 2 * centre - secondTail(V - v);
      return (below - secondTail(v + V)) / (2 * V);
    },
  };
}

/**
 * From F(v) in the laboratory: η(v) = ∫_v^∞ F(u)/u du. Errors and accuracy as tabulatedGalacticHalo; a kink between two
 * points is cut off by the straight line between them.
 */
export function tabulatedLaboratoryHalo(table: SpeedTable): TabulatedHalo {
  const integrals = speedIntegrals(table);
  requireNothingAtZero(table);
  return {
    largestSpeedKmPerS: integrals.lastKmPerS,
    kinksKmPerS: kinksInside(Array.from(table.speedsKmPerS), integrals.lastKmPerS),
    normalisation: integrals.normalisation,
    meanInverseSpeed: integrals.inverseSpeedTail,
  };
}

/**
 * From η(v_min): straight between the points, constant below the first (nothing is slower) and 0 above the last; if it is
 * not 0 there, it falls to 0 in a step. ∫ η dv, over all speeds from 0, must be above 0 and is what the values are
 * divided by.
 *
 * @throws DomainError as tabulatedGalacticHalo, and where η rises: the distribution −v dη/dv would be negative
 */
export function tabulatedMeanInverseSpeed(table: SpeedTable): TabulatedHalo {
  const { v, f } = checkedTable(table);
  const rise = f.findIndex((value, i) => i > 0 && value > f[i - 1]);
  if (rise > 0)
    throw new DomainError(['values', rise], f[rise], `at most the value before it, ${f[rise - 1]}: η never rises`);
  const last = lastPoint(f);
  let integral = v[0] * f[0];
  for (let i = 1; i <= last; i++) integral += ((v[i] - v[i - 1]) * (f[i] + f[i - 1])) / 2;
  const norm = requireIntegral(integral);
  const largestSpeedKmPerS = v[last];
  const speeds = v.subarray(0, last + 1);
  return {
    largestSpeedKmPerS,
    kinksKmPerS: kinksInside([...speeds], largestSpeedKmPerS),
    normalisation: norm,
    meanInverseSpeed(x) {
      if (x >= largestSpeedKmPerS) return 0;
      if (x <= v[0]) return f[0] / norm;
      const i = intervalBelow(speeds, x);
      return (f[i] + ((f[i + 1] - f[i]) * (x - v[i])) / (v[i + 1] - v[i])) / norm;
    },
  };
}
