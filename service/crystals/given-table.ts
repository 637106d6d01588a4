/**
 * A table as it was given. A dielectric function has two matrices, of which the calculation takes one at a time: Im ε, which is
 * the table of independent particles, or the loss function Im[−1/ε] = Im ε/|ε|², which is that of the medium.
 */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { screenedTable } from '../../physics/crystal/dielectric.ts';

export interface GivenTable extends CrystalTable {
  /** Re ε, for a dielectric function; the values are then Im ε. */
  readonly realDielectric?: Float64Array;
}

/** The loss function of a table of Im ε with its Re ε. */
export function lossTable({ values, cellVolumeAngstrom3, ...table }: CrystalTable, real: Float64Array): CrystalTable {
  return screenedTable({ ...table, cellVolumeAngstrom3: cellVolumeAngstrom3!, real, imaginary: values });
}

/** The first number at which ε is so near 0 that Im[−1/ε] cannot be held; −1 if there is none. */
export function whereLossIsLost(real: Float64Array, imaginary: Float64Array): number {
  return imaginary.findIndex((im, i) => im > 0 && !(im / (real[i] * real[i] + im * im) < Infinity));
}
