/**
 * A function K(v) of the speed, per bin, known through its exact moments on the cells of a dyadic grid, for integrals ∫ K
 * η dv with η's that are not known yet. K is a sum of millions of boxes and ramps (rate/response), η smooth but for a few
 * kinks: so on a cell where η has none, η is the cubic through four Gauss–Legendre nodes, which K's moments of order 0…3
 * integrate exactly,
 *
 *   ∫_cell K η dv ≈ Σ_k W_k η(v_k),    W_k = ∫_cell K(v) ℓ_k(v) dv,
 *
 * a cell that holds a kink, or over which η falls steeply, is halved, down to the finest; there K is the straight line
 * with its first two moments.
 */
import type { VelocityDistribution } from '../halo/velocity-distribution.ts';
import { gaussLegendre } from '../numeric/gauss-legendre.ts';

/** Cells of the coarsest level. */
const COARSE_CELLS = 16;
/** A section of η (halo/velocity-distribution) is resolved by at least so many cells. */
const CELLS_A_SECTION = 16;
/** A cell over which η falls by more than this factor, from its first node to its last, is halved. */
const STEEPEST = 4;

const ORDERS = 4;
/** Nodes on [0, 1]. */
const NODES = gaussLegendre(ORDERS).nodes.map((x) => (1 + x) / 2);
/** Coefficients of ℓ_k in powers of t: ℓ_k(t) = Σ_p LAGRANGE[k][p] t^p. */
const LAGRANGE = NODES.map((own, k) => {
  let coefficients = [1];
  NODES.forEach((other, i) => {
    if (i === k) return;
    const next = new Array<number>(coefficients.length + 1).fill(0);
    coefficients.forEach((c, p) => {
      next[p] -= (c * other) / (own - other);
      next[p + 1] += c / (own - other);
    });
    coefficients = next;
  });
  return coefficients;
});
/** Two-node Gauss–Legendre on [0, 1], for the pieces of a finest cell. */
const PIECE_NODES = gaussLegendre(2).nodes.map((x) => (1 + x) / 2);

export interface SpeedGrid {
  readonly fromKmPerS: number;
  readonly toKmPerS: number;
  readonly bins: number;
  /** Per bin the speed up to which nothing was added: K is exactly 0 there. Infinity for an empty bin. */
  readonly beginsKmPerS: Float64Array;
  /** Per level, coarsest first: W at [(cell · 4 + node) · bins + bin]. */
  readonly weights: readonly Float64Array[];
}

/** Collects boxes and ramps. */
export interface SpeedDeposit {
  /**
   * Adds jump + slope (v − at) for all v ≥ at to bin `bin` of K; `at` in km/s, slope per km/s. Beyond the grid's end:
   * nothing.
   */
  add(bin: number, at: number, jump: number, slope: number): void;
  /** The grid, once everything is added. */
  grid(): SpeedGrid;
}

/**
 * An empty K between two speeds (km/s) for so many bins, with cells halved so often. Cost of `add`: a dozen operations;
 * memory: 1 kB × 2^halvings for each bin.
 */
export function speedDeposit(fromKmPerS: number, toKmPerS: number, bins: number, halvings: number): SpeedDeposit {
  const cells = COARSE_CELLS * 2 ** halvings;
  const h = (toKmPerS - fromKmPerS) / cells;
  /**
   * Moments ∫ K t^p dv at [(bin · cells + cell) · 4 + p]; what cells begin with on top of the one before, at [bin · cells +
   * cell].
   */
  const moments = new Float64Array(bins * cells * ORDERS);
  const beginValue = new Float64Array(bins * cells);
  const beginSlope = new Float64Array(bins * cells);
  const beginsKmPerS = new Float64Array(bins).fill(Infinity);

  function addRamp(at: number, t: number, slope: number): void {
    const rise = slope * h * h;
    for (let p = 0, power = t; p < ORDERS; p++, power *= t) {
      // ∫_t^1 (s − t) s^p ds
      moments[at * ORDERS + p] += rise * ((1 - power * t) / (p + 2) - (t * (1 - power)) / (p + 1));
    }
  }

  return {
    add(bin, at, jump, slope) {
      const position = Math.max(0, (at - fromKmPerS) / h);
      if (!(position < cells)) return;
      if (at < beginsKmPerS[bin]) beginsKmPerS[bin] = at;
      const cell = position | 0;
      const t = position - cell;
      const index = bin * cells + cell;
      const m = index * ORDERS;
      const box = jump * h;
      const t2 = t * t;
      moments[m] += box * (1 - t);
      moments[m + 1] += (box * (1 - t2)) / 2;
      moments[m + 2] += (box * (1 - t2 * t)) / 3;
      moments[m + 3] += (box * (1 - t2 * t2)) / 4;
      if (slope !== 0) addRamp(index, t, slope);
      if (cell + 1 < cells) {
        beginValue[index + 1] += jump + slope * h * (1 - t);
        beginSlope[index + 1] += slope;
      }
    },
    grid() {
      for (let bin = 0; bin < bins; bin++) {
        let [value, slope] = [0, 0];
        for (let cell = 0; cell < cells; cell++) {
          const index = bin * cells + cell;
          value += slope * h + beginValue[index];
          slope += beginSlope[index];
          for (let p = 0; p < ORDERS; p++) moments[index * ORDERS + p] += h * (value / (p + 1) + (slope * h) / (p + 2));
        }
      }
      const levels: Float64Array[] = [moments];
      for (let halving = 0; halving < halvings; halving++) levels.unshift(mergedMoments(levels[0]));
      const weights = levels.map((level) => nodeWeights(level, bins));
      return { fromKmPerS, toKmPerS, bins, beginsKmPerS, weights };
    },
  };
}

/**
 * Moments of cells twice as wide: with t = (c + t′)/2 in child c, Σ_c ∫ K t^p dv. Every bin has an even number of cells.
 */
function mergedMoments(fine: Float64Array): Float64Array {
  const merged = new Float64Array(fine.length / 2);
  for (let cell = 0; cell < merged.length / ORDERS; cell++) {
    const a = 2 * cell * ORDERS;
    const b = a + ORDERS;
    merged[cell * ORDERS] = fine[a] + fine[b];
    merged[cell * ORDERS + 1] = (fine[a + 1] + fine[b] + fine[b + 1]) / 2;
    merged[cell * ORDERS + 2] = (fine[a + 2] + fine[b] + 2 * fine[b + 1] + fine[b + 2]) / 4;
    merged[cell * ORDERS + 3] = (fine[a + 3] + fine[b] + 3 * fine[b + 1] + 3 * fine[b + 2] + fine[b + 3]) / 8;
  }
  return merged;
}

function nodeWeights(moments: Float64Array, bins: number): Float64Array {
  const weights = new Float64Array(moments.length);
  const cells = moments.length / ORDERS / bins;
  for (let bin = 0; bin < bins; bin++) {
    for (let cell = 0; cell < cells; cell++) {
      const m = (bin * cells + cell) * ORDERS;
      for (let k = 0; k < ORDERS; k++) {
        const l = LAGRANGE[k];
        weights[(cell * ORDERS + k) * bins + bin] =
          l[0] * moments[m] + l[1] * moments[m + 1] + l[2] * moments[m + 2] + l[3] * moments[m + 3];
      }
    }
  }
  return weights;
}

/** Where η is not smooth: its kinks, the ends of its sections and of itself; and how finely a section must be resolved. */
interface Roughness {
  readonly breaks: readonly number[];
  readonly sectionEnds: readonly number[];
}

function roughnessOf(halo: VelocityDistribution): Roughness {
  const sectionEnds = [0, ...(halo.sectionEndsKmPerS ?? []), halo.largestSpeedKmPerS];
  const breaks = [...halo.kinksKmPerS, ...sectionEnds.slice(1)].sort((a, b) => a - b);
  return { breaks, sectionEnds };
}

/** ∫ K η dv for every bin, written into `out`. The halo must not be faster than the grid's end. No allocation a cell. */
export function integrateOver(grid: SpeedGrid, halo: VelocityDistribution, out: Float64Array): void {
  const { fromKmPerS, toKmPerS, bins, weights } = grid;
  const { breaks, sectionEnds } = roughnessOf(halo);
  const finestLevel = weights.length - 1;
  const largest = halo.largestSpeedKmPerS;
  let nextBreak = 0; // first break above the start of what is left
  let section = 0;
  out.fill(0);

  function visit(level: number, cell: number): void {
    const width = (toKmPerS - fromKmPerS) / (COARSE_CELLS * 2 ** level);
    const from = fromKmPerS + cell * width;
    if (from >= largest) return;
    while (nextBreak < breaks.length && breaks[nextBreak] <= from) nextBreak++;
    while (section + 2 < sectionEnds.length && sectionEnds[section + 1] <= from) section++;
    const isWhole = !(breaks[nextBreak] < from + width);
    const isFine = width * CELLS_A_SECTION <= sectionEnds[section + 1] - sectionEnds[section];
    const isFinest = level === finestLevel;
    if (isWhole && (isFine || isFinest) && addWhole(weights[level], cell, from, width, isFinest)) return;
    if (isFinest) addPieces(cell, from, width);
    else {
      visit(level + 1, 2 * cell);
      visit(level + 1, 2 * cell + 1);
    }
  }

  /** Adds a cell without breaks, or says no if η is too steep in it. */
  function addWhole(levelWeights: Float64Array, cell: number, from: number, width: number, always: boolean): boolean {
    const eta0 = halo.meanInverseSpeed(from + width * NODES[0]);
    const eta3 = halo.meanInverseSpeed(from + width * NODES[3]);
    if (!always && eta0 > STEEPEST * eta3) return false;
    const eta1 = halo.meanInverseSpeed(from + width * NODES[1]);
    const eta2 = halo.meanInverseSpeed(from + width * NODES[2]);
    const at = cell * ORDERS * bins;
    for (let bin = 0; bin < bins; bin++) {
      out[bin] +=
        eta0 * levelWeights[at + bin] +
        eta1 * levelWeights[at + bins + bin] +
        eta2 * levelWeights[at + 2 * bins + bin] +
        eta3 * levelWeights[at + 3 * bins + bin];
    }
    return true;
  }

  /** A finest cell, divided at its breaks: K = a + b t with its moments of order 0 and 1, Σ W_k and Σ W_k t_k. */
  function addPieces(cell: number, from: number, width: number): void {
    let [eta0, eta1] = [0, 0]; // ∫ η dt, ∫ η t dt
    let start = 0;
    for (let i = nextBreak; start < 1; i++) {
      const end = Math.min(1, ((breaks[i] ?? Infinity) - from) / width);
      for (const node of PIECE_NODES) {
        const t = start + (end - start) * node;
        const part = ((end - start) / 2) * halo.meanInverseSpeed(from + width * t);
        eta0 += part;
        eta1 += part * t;
      }
      start = end;
    }
    const finest = weights[finestLevel];
    for (let bin = 0; bin < bins; bin++) {
      let [k0, k1] = [0, 0];
      for (let k = 0; k < ORDERS; k++) {
        const w = finest[(cell * ORDERS + k) * bins + bin];
        k0 += w;
        k1 += w * NODES[k];
      }
      const b = 12 * (k1 - k0 / 2);
      out[bin] += (k0 - b / 2) * eta0 + b * eta1;
    }
  }

  for (let cell = 0; cell < COARSE_CELLS; cell++) visit(0, cell);
  // a finest cell's straight line may spread a beginning inside it to speeds below
  for (let bin = 0; bin < bins; bin++) if (!(out[bin] > 0 && grid.beginsKmPerS[bin] < largest)) out[bin] = 0;
}

/** The finest cells: their edges, km/s, ascending, and per bin the mean of K over each. */
export function cellMeans(grid: SpeedGrid): { readonly edgesKmPerS: Float64Array; readonly means: Float64Array[] } {
  const { fromKmPerS, toKmPerS, bins, weights } = grid;
  const finest = weights[weights.length - 1];
  const cells = COARSE_CELLS * 2 ** (weights.length - 1);
  const width = (toKmPerS - fromKmPerS) / cells;
  const meanOf = (bin: number, cell: number): number => {
    let sum = 0;
    for (let k = 0; k < ORDERS; k++) sum += finest[(cell * ORDERS + k) * bins + bin];
    return sum / width;
  };
  return {
    edgesKmPerS: Float64Array.from({ length: cells + 1 }, (_, i) => fromKmPerS + i * width),
    means: Array.from({ length: bins }, (_, bin) =>
      Float64Array.from({ length: cells }, (_, cell) => meanOf(bin, cell)),
    ),
  };
}
