/**
 * The tail of the mean inverse speed, H(v) = ∫_v^∞ η(v′) dv′ (dimensionless, H(0) = 1), and its own tail H₂(v) = ∫_v^∞ H dv′
 * (km/s), tabulated for evaluation millions of times.
 *
 * At fixed momentum transfer q the energy integral of the rate over [E₁, E₂] is q [H(v₁) − H(v₂)], v = (E + δ)/q + q/2m_χ: no
 * quadrature in energy, no kinks to hunt, no digits lost at the kinematic edge. H₂ does the same for an integrand linear in E.
 *
 * H is a piecewise cubic that matches H and its slope −η at both ends of each cell, H₂ its exact integral. H vanishes like
 * (v_max − v)³ at the edge (like its square where the laboratory is at rest), which a cubic reproduces: the relative accuracy
 * holds right up to v_max.
 */
import type { VelocityDistribution } from './velocity-distribution.ts';

export interface SpeedTail {
  /** Lower end of the table and width of a cell, km/s. Speeds below the lower end are extrapolated from the first cell. */
  readonly fromKmPerS: number;
  readonly cellKmPerS: number;
  readonly cells: number;
  /** Four numbers a cell: H = c₀ + c₁t + c₂t² + c₃t³ with t the position in the cell, 0…1. */
  readonly coefficients: Float64Array;
  /** H₂ at the lower end of each cell, km/s. */
  readonly secondTail: Float64Array;
  /** The finer table that goes on where this one ends; without one, this one ends at the largest speed. */
  readonly top: SpeedTail | undefined;
}

/** Cells of the whole table, and of each finer one for its last speeds: near v_max relative accuracy needs ever finer cells. */
const CELLS = 1024;
const TOP_CELLS = 256;
/** Cells that a finer table takes over, and how often that is repeated: down to 1e-5 of v_max. */
const CELLS_TAKEN_OVER = 32;
const FINER_TABLES = 4;

/** ∫ η over [from, to], Simpson's rule on pieces divided at the kinks. `atFrom` and `atTo` are η at the ends. */
function cellIntegral(halo: VelocityDistribution, from: number, to: number, atFrom: number, atTo: number): number {
  const simpson = (a: number, b: number, fa: number, fb: number): number =>
    ((b - a) / 6) * (fa + 4 * halo.meanInverseSpeed((a + b) / 2) + fb);
  const kinks = halo.kinksKmPerS.filter((v) => v > from && v < to);
  if (kinks.length === 0) return simpson(from, to, atFrom, atTo);
  const ends = [from, ...kinks, to];
  let sum = 0;
  for (let i = 1; i < ends.length; i++) {
    const [a, b] = [ends[i - 1], ends[i]];
    const middle = (a + b) / 2;
    const [fa, fm, fb] = [a, middle, b].map((v) => halo.meanInverseSpeed(v));
    sum += simpson(a, middle, fa, fm) + simpson(middle, b, fm, fb);
  }
  return sum;
}

/**
 * Tabulates H and H₂ from `fromKmPerS` (≥ 0, below the largest speed) to the largest speed. Cost: two evaluations of η a cell.
 *
 * Accuracy: differences H(v₁) − H(v₂) to 1e-7 relative, typically 1e-9 (test/physics/halo/speed-tail.test.ts).
 */
export function speedTail(halo: VelocityDistribution, fromKmPerS: number): SpeedTail {
  return tabulate(halo, fromKmPerS, CELLS, FINER_TABLES);
}

function tabulate(halo: VelocityDistribution, fromKmPerS: number, wholeCells: number, finerTables: number): SpeedTail {
  const cellKmPerS = (halo.largestSpeedKmPerS - fromKmPerS) / wholeCells;
  const cells = finerTables > 0 ? wholeCells - CELLS_TAKEN_OVER : wholeCells;
  const topFromKmPerS = fromKmPerS + cells * cellKmPerS;
  const top = finerTables > 0 ? tabulate(halo, topFromKmPerS, TOP_CELLS, finerTables - 1) : undefined;
  const coefficients = new Float64Array(4 * cells);
  const secondTail = new Float64Array(cells);
  let tail = top ? top.coefficients[0] : 0;
  let second = top ? top.secondTail[0] : 0;
  let to = top ? topFromKmPerS : halo.largestSpeedKmPerS;
  let above = top ? halo.meanInverseSpeed(topFromKmPerS) : 0;
  for (let i = cells - 1; i >= 0; i--) {
    const from = fromKmPerS + i * cellKmPerS;
    const eta = halo.meanInverseSpeed(from);
    const drop = cellIntegral(halo, from, to, eta, above);
    const [slope, slopeAbove] = [-eta * cellKmPerS, -above * cellKmPerS];
    // the cubic with H = tail + drop, H′ = slope at t = 0 and H = tail, H′ = slopeAbove at t = 1
    const [c0, c2, c3] = [tail + drop, -3 * drop - 2 * slope - slopeAbove, 2 * drop + slope + slopeAbove];
    coefficients.set([c0, slope, c2, c3], 4 * i);
    second += cellKmPerS * (c0 + slope / 2 + c2 / 3 + c3 / 4);
    secondTail[i] = second;
    [tail, above, to] = [c0, eta, from];
  }
  return { fromKmPerS, cellKmPerS, cells, coefficients, secondTail, top };
}

/** H(v) from the table; 0 from the largest speed on. */
export function tailAt(tail: SpeedTail, vKmPerS: number): number {
  const position = (vKmPerS - tail.fromKmPerS) / tail.cellKmPerS;
  if (position >= tail.cells) return tail.top ? tailAt(tail.top, vKmPerS) : 0;
  const i = Math.max(0, Math.floor(position));
  return tailInCell(tail, i, position - i);
}

/** H₂(v), km/s, from the table; 0 from the largest speed on. */
export function secondTailAt(tail: SpeedTail, vKmPerS: number): number {
  const position = (vKmPerS - tail.fromKmPerS) / tail.cellKmPerS;
  if (position >= tail.cells) return tail.top ? secondTailAt(tail.top, vKmPerS) : 0;
  const i = Math.max(0, Math.floor(position));
  return secondTailInCell(tail, i, position - i);
}

/** H at position t, 0…1, in cell i. */
export function tailInCell(tail: SpeedTail, i: number, t: number): number {
  const c = tail.coefficients;
  const k = 4 * i;
  return c[k] + t * (c[k + 1] + t * (c[k + 2] + t * c[k + 3]));
}

/** H₂ at position t, 0…1, in cell i, km/s: the exact integral of the cubic. */
export function secondTailInCell(tail: SpeedTail, i: number, t: number): number {
  const c = tail.coefficients;
  const k = 4 * i;
  return (
    tail.secondTail[i] - tail.cellKmPerS * t * (c[k] + t * (c[k + 1] / 2 + t * (c[k + 2] / 3 + (t * c[k + 3]) / 4)))
  );
}
