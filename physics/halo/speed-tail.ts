/**
 * The tail of the mean inverse speed, H(v) = ∫_v^∞ η(v′) dv′ (dimensionless, H(0) = 1), and its own tail H₂(v) = ∫_v^∞ H
 * dv′ (km/s), tabulated for evaluation millions of times.
 *
 * At fixed momentum transfer q the energy integral of the rate over [E₁, E₂] is q [H(v₁) − H(v₂)], v = (E + δ)/q +
 * q/2m_χ: no quadrature in energy, no kinks to hunt, no digits lost at the kinematic edge. H₂ does the same for an
 * integrand linear in E.
 *
 * H is a piecewise cubic that matches H and its slope −η at both ends of each cell, H₂ its exact integral. H vanishes
 * like (v_max − v)³ at the edge (like its square where the laboratory is at rest), which a cubic reproduces: the relative
 * accuracy holds right up to v_max. Where η jumps, H has a corner: there one section of the table ends and the next
 * begins, as it does at the ends of a stretch over which η falls steeply.
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
  /**
   * The table, finer or of the next section, that goes on where this one ends; without one, this ends at the largest speed.
   */
  readonly top: SpeedTail | undefined;
}

/**
 * Cells of the whole table, the fewest of a section of it, and of each finer one for its last speeds: near v_max relative
 * accuracy needs ever finer cells.
 */
const CELLS = 1024;
const SECTION_CELLS = 256;
const TOP_CELLS = 256;
/** Cells that a finer table takes over, and how often that is repeated: down to 1e-5 of v_max. */
const CELLS_TAKEN_OVER = 32;
const FINER_TABLES = 4;

/** The kinks, ascending, strictly between two speeds. There may be thousands: a tabulated η has one at each point. */
function kinksBetween(kinks: readonly number[], from: number, to: number): readonly number[] {
  let [low, high] = [0, kinks.length];
  while (low < high) {
    const middle = (low + high) >> 1;
    if (kinks[middle] > from) high = middle;
    else low = middle + 1;
  }
  let end = low;
  while (end < kinks.length && kinks[end] < to) end++;
  return kinks.slice(low, end);
}

/** ∫ η over [from, to], Simpson's rule on pieces divided at the kinks. `atFrom` and `atTo` are η at the ends. */
function cellIntegral(halo: VelocityDistribution, from: number, to: number, atFrom: number, atTo: number): number {
  const simpson = (a: number, b: number, fa: number, fb: number): number =>
    ((b - a) / 6) * (fa + 4 * halo.meanInverseSpeed((a + b) / 2) + fb);
  const kinks = kinksBetween(halo.kinksKmPerS, from, to);
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

/** η just below a speed: the value before a jump. */
function belowJump(halo: VelocityDistribution, vKmPerS: number): number {
  return halo.meanInverseSpeed(vKmPerS * (1 - Number.EPSILON));
}

/**
 * Tabulates H and H₂ from `fromKmPerS` (≥ 0, below the largest speed) to the largest speed. Cost: two evaluations of η a
 * cell.
 *
 * Accuracy: differences H(v₁) − H(v₂) to 1e-7 relative, typically 1e-9 (test/physics/halo/speed-tail.test.ts).
 */
export function speedTail(halo: VelocityDistribution, fromKmPerS: number): SpeedTail {
  const largest = halo.largestSpeedKmPerS;
  const inside = (halo.sectionEndsKmPerS ?? []).filter((v) => v > fromKmPerS && v < largest);
  const ends = [fromKmPerS, ...inside, largest];
  const cellsOf = (from: number, to: number): number =>
    Math.max(SECTION_CELLS, Math.ceil((CELLS * (to - from)) / (largest - fromKmPerS)));
  let tail: SpeedTail | undefined;
  for (let i = ends.length - 1; i > 0; i--) {
    const [from, to] = [ends[i - 1], ends[i]];
    tail = tabulate(halo, from, to, cellsOf(from, to), tail ? 0 : FINER_TABLES, tail);
  }
  return tail!;
}

/** The table from one speed to another, its last cells in finer tables if so wanted; `next` goes on from there. */
function tabulate(
  halo: VelocityDistribution,
  fromKmPerS: number,
  toKmPerS: number,
  wholeCells: number,
  finerTables: number,
  next: SpeedTail | undefined,
): SpeedTail {
  const cellKmPerS = (toKmPerS - fromKmPerS) / wholeCells;
  const cells = finerTables > 0 ? wholeCells - CELLS_TAKEN_OVER : wholeCells;
  let to = finerTables > 0 ? fromKmPerS + cells * cellKmPerS : toKmPerS;
  let above = finerTables > 0 ? halo.meanInverseSpeed(to) : belowJump(halo, to);
  const top = finerTables > 0 ? tabulate(halo, to, toKmPerS, TOP_CELLS, finerTables - 1, next) : next;
  const coefficients = new Float64Array(4 * cells);
  const secondTail = new Float64Array(cells);
  let tail = top ? top.coefficients[0] : 0;
  let second = top ? top.secondTail[0] : 0;
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
