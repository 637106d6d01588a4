/**
 * Other cells for the same table, with nothing gained or lost: over every new cell ∫∫ |f(q, E)|² dq dE is what it was. A value is a
 * mean over its cell, weighted with dq dE for |f|², and with q⁵ dq dE for a loss function or Im ε, whose |f|² carries the q⁵.
 *
 *   new value = Σ old value · (measure of the overlap) / (measure of the new cell),   measures ΔE · Δq or ΔE · ∫ q⁵ dq
 *
 * Splitting cells changes nothing at all. Merging them keeps the integrals but forgets where in the new cell the strength was:
 * rates change in second order of the cell's width.
 */
import { DomainError } from '../errors.ts';
import { gaussLegendre } from '../numeric/gauss-legendre.ts';
import { type CrystalTable, columnsOf, rowsOf } from './crystal-table.ts';
import { meanFifthPower } from './fifth-power.ts';

/** One new cell: the old cells it overlaps and the weight of each, adding up to 1. */
interface Blend {
  readonly from: number;
  readonly weights: readonly number[];
}

/**
 * The table on new edges, eV, which begin and end where the old ones do and otherwise are free.
 *
 * Accuracy: integrals over cells and the f-sum are kept to rounding, rates of merged tables as measured in
 * test/physics/crystal/regrid.test.ts.
 *
 * @throws DomainError for a table of points (see `cellsOf`), or edges that do not ascend from the old first to the old last
 */
export function regridded(
  table: CrystalTable,
  momentumEdgesEv: Float64Array,
  energyEdgesEv: Float64Array,
): CrystalTable {
  if (table.axes !== 'edges') throw new DomainError('axes', table.axes, 'a table of cells, with edges');
  requireSameSpan('momentum', table.momentumEv, momentumEdgesEv);
  requireSameSpan('energy', table.energyEv, energyEdgesEv);
  const isPlain = table.quantity === 'formFactorSquared';
  const momentumMeasure = isPlain ? length : (a: number, b: number) => (b - a) * meanFifthPower(a, b);
  const rows = blends(table.momentumEv, momentumEdgesEv, momentumMeasure);
  const columns = blends(table.energyEv, energyEdgesEv, length);
  const oldColumns = columnsOf(table);
  const values = new Float64Array(rows.length * columns.length);
  const merged = new Float64Array(oldColumns);
  rows.forEach((row, i) => {
    merged.fill(0);
    row.weights.forEach((weight, k) => {
      const at = (row.from + k) * oldColumns;
      for (let j = 0; j < oldColumns; j++) merged[j] += weight * table.values[at + j];
    });
    columns.forEach(({ from, weights }, j) => {
      values[i * columns.length + j] = weights.reduce((sum, weight, k) => sum + weight * merged[from + k], 0);
    });
  });
  return { ...table, momentumEv: momentumEdgesEv, energyEv: energyEdgesEv, values };
}

function length(a: number, b: number): number {
  return b - a;
}

function requireSameSpan(name: string, old: Float64Array, fresh: Float64Array): void {
  const [first, last] = [old[0], old[old.length - 1]];
  const ascends = fresh.every((x, i) => i === 0 || x > fresh[i - 1]);
  if (!(fresh.length >= 2 && ascends && fresh[0] === first && fresh[fresh.length - 1] === last))
    throw new DomainError(name, fresh.length, `strictly increasing edges from ${first} to ${last} eV`);
}

function blends(old: Float64Array, fresh: Float64Array, measure: (a: number, b: number) => number): Blend[] {
  const result: Blend[] = [];
  let i = 0;
  for (let k = 0; k < fresh.length - 1; k++) {
    const [a, b] = [fresh[k], fresh[k + 1]];
    while (old[i + 1] <= a) i++;
    const from = i;
    const weights: number[] = [];
    for (let n = i; n < old.length - 1 && old[n] < b; n++)
      weights.push(measure(Math.max(a, old[n]), Math.min(b, old[n + 1])) / measure(a, b));
    result.push({ from, weights });
  }
  return result;
}

/**
 * At most about `most` cells from an axis, merging neighbours in equal numbers. Edges at both sides of each energy in `keepEv` (the
 * band gap, say) stay: a cell merged across the gap would lose what is averaged to below it. They may add a few cells.
 */
export function coarserEdges(edgesEv: Float64Array, most: number, keepEv: readonly number[] = []): Float64Array {
  const cells = edgesEv.length - 1;
  const group = Math.max(1, Math.ceil(cells / Math.max(1, Math.floor(most))));
  const isKept = (i: number): boolean =>
    keepEv.some(
      (keep) =>
        edgesEv[i] === keep ||
        (edgesEv[i] < keep && edgesEv[i + 1] > keep) ||
        (edgesEv[i] > keep && edgesEv[i - 1] < keep),
    );
  return edgesEv.filter((_, i) => i === 0 || i === cells || i % group === 0 || isKept(i));
}

/** Every cell of an axis in `parts` equal ones; the old edges stay exactly what they are. */
export function finerEdges(edgesEv: Float64Array, parts: number): Float64Array {
  const fine: number[] = [];
  for (let i = 0; i < edgesEv.length - 1; i++)
    for (let p = 0; p < parts; p++) fine.push(edgesEv[i] + ((edgesEv[i + 1] - edgesEv[i]) * p) / parts);
  return Float64Array.from([...fine, edgesEv[edgesEv.length - 1]]);
}

/** Exact for the fifth power times a line. */
const RULE = gaussLegendre(4);

/**
 * A table of points as one of cells, between the same numbers: each cell has the mean of the bilinear |f|² over it (for a loss
 * function or Im ε: the mean weighted with q⁵). Its integrals over cells are those of the table of points, to rounding.
 *
 * @throws DomainError for a table that has cells already
 */
export function cellsOf(table: CrystalTable): CrystalTable {
  if (table.axes !== 'points') throw new DomainError('axes', table.axes, 'a table of points');
  const { momentumEv, energyEv } = table;
  const isPlain = table.quantity === 'formFactorSquared';
  const columns = columnsOf(table);
  const values = new Float64Array((rowsOf(table) - 1) * (columns - 1));
  for (let i = 0; i < rowsOf(table) - 1; i++) {
    const upper = isPlain ? 0.5 : upperShare(momentumEv[i], momentumEv[i + 1]);
    for (let j = 0; j < columns - 1; j++) {
      const at = i * columns + j;
      const low = (table.values[at] + table.values[at + 1]) / 2;
      const high = (table.values[at + columns] + table.values[at + columns + 1]) / 2;
      values[i * (columns - 1) + j] = low + upper * (high - low);
    }
  }
  return { ...table, axes: 'edges', momentumEv, energyEv, values };
}

/** ∫ q⁵ t dq / ∫ q⁵ dq with t from 0 at a to 1 at b. */
function upperShare(a: number, b: number): number {
  let sum = 0;
  RULE.nodes.forEach((node, g) => {
    const t = (1 + node) / 2;
    sum += (RULE.weights[g] / 2) * t * (a + (b - a) * t) ** 5;
  });
  return sum / meanFifthPower(a, b);
}
