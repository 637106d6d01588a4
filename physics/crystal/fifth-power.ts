/**
 * q⁵ of a table's rows, eV⁵: what stands between |f|² and the dielectric response, and in the f-sum rule. For edges the mean over
 * the cell, because the value is one; (b⁶ − a⁶)/(6(b − a)) written without cancellation. For points q⁵ itself.
 */
import { type CrystalTable, rowsOf } from './crystal-table.ts';

/** Mean of q⁵ between a and b. */
export function meanFifthPower(a: number, b: number): number {
  return (((((a + b) * a + b ** 2) * a + b ** 3) * a + b ** 4) * a + b ** 5) / 6;
}

/** One number a row, eV⁵; 0 for a sample at q = 0. */
export function rowFifthPowersEv5(table: CrystalTable): Float64Array {
  const { momentumEv, axes } = table;
  return Float64Array.from({ length: rowsOf(table) }, (_, i) =>
    axes === 'edges' ? meanFifthPower(momentumEv[i], momentumEv[i + 1]) : momentumEv[i] ** 5,
  );
}

/** The momentum that stands for each row, eV: the middle of a cell, or the sample's own. */
export function rowMomentaEv(table: CrystalTable): Float64Array {
  const { momentumEv, axes } = table;
  return Float64Array.from({ length: rowsOf(table) }, (_, i) =>
    axes === 'edges' ? (momentumEv[i] + momentumEv[i + 1]) / 2 : momentumEv[i],
  );
}
