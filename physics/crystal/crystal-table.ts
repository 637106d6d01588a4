/**
 * A crystal form factor table: |f(q, E)|² or the loss function Im[−1/ε(q, E)] on a grid of momentum and energy transfer.
 *
 *   edges    N + 1 numbers an axis; a value is the mean over its cell and taken constant in it
 *   points   N numbers an axis; values are samples, bilinear between them, nothing outside
 */
import { ELECTRON_MASS_EV, FINE_STRUCTURE, HBAR_C_EV_ANGSTROM } from '../constants.ts';

export type AxisKind = 'edges' | 'points';
export type TableQuantity = 'formFactorSquared' | 'lossFunction';
/** What a table may hold inside the calculation: beside what callers give, Im ε, the unscreened half of a dielectric function. */
export type ResponseQuantity = TableQuantity | 'imaginaryDielectric';

export interface CrystalTable {
  readonly axes: AxisKind;
  readonly quantity: ResponseQuantity;
  /** Momentum axis, eV, strictly increasing, ≥ 0. */
  readonly momentumEv: Float64Array;
  /** Energy axis, eV, strictly increasing, ≥ 0. */
  readonly energyEv: Float64Array;
  /** Row-major values, one row a momentum, one column an energy; finite and ≥ 0. May be shared between threads. */
  readonly values: Float64Array;
  /** Mass of the unit cell, eV. */
  readonly cellMassEv: number;
  /** Volume of the unit cell, Å³; a loss function needs it. */
  readonly cellVolumeAngstrom3?: number;
}

/** Columns of the value matrix. */
export function columnsOf(table: CrystalTable): number {
  return table.axes === 'edges' ? table.energyEv.length - 1 : table.energyEv.length;
}

/** Rows of the value matrix. */
export function rowsOf(table: CrystalTable): number {
  return table.axes === 'edges' ? table.momentumEv.length - 1 : table.momentumEv.length;
}

/** Volume of the unit cell, eV⁻³; NaN where the table has none. */
export function cellVolumePerEv3(table: { readonly cellVolumeAngstrom3?: number }): number {
  return (table.cellVolumeAngstrom3 ?? Number.NaN) / HBAR_C_EV_ANGSTROM ** 3;
}

/** V_cell/(8π² α² mₑ²), eV⁻⁵: |f|² for each unit of q⁵ Im[−1/ε] (screened) or of q⁵ Im ε (unscreened). */
export function formFactorPerResponse(table: { readonly cellVolumeAngstrom3?: number }): number {
  return cellVolumePerEv3(table) / (8 * Math.PI ** 2 * FINE_STRUCTURE ** 2 * ELECTRON_MASS_EV ** 2);
}

/**
 * What turns the table's quantity into |f(q, E)|² at momentum q (eV): 1 for a form factor; for a loss function
 * |f|² = V_cell q⁵ Im[−1/ε]/(8π² α² mₑ²), from S(q, ω) = (q²/2πα) Im[−1/ε] per volume (Nozières & Pines, Phys. Rev. 113,
 * 1254 (1959)), and likewise with Im ε for independent particles. It varies with q, so it stays inside the momentum integral.
 */
export function formFactorPerValue(table: CrystalTable): (qEv: number) => number {
  if (table.quantity === 'formFactorSquared') return () => 1;
  const factor = formFactorPerResponse(table);
  return (q) => factor * q ** 5;
}
