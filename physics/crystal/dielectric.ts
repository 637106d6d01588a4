/**
 * The dielectric function ε(q, E) of a crystal and the two form factors that follow from it (random-phase approximation without
 * local fields: Adler, Phys. Rev. 126, 413 (1962); Wiser, Phys. Rev. 129, 62 (1963)):
 *
 *   unscreened   |f|² = V q⁵ Im ε/(8π² α² mₑ²)              independent particles
 *   screened     |f|² = V q⁵ Im[−1/ε]/(8π² α² mₑ²)          = unscreened / |ε|²
 *
 * Where only an unscreened table is there, Re ε follows from Im ε by Kramers–Kronig (crystal/kramers-kronig). What the table
 * lacks of the f-sum rule lies above its last energy T and enters as one pole (`missingPoles`).
 */
import { ELECTRON_MASS_EV } from '../constants.ts';
import { DomainError, requirePositive } from '../errors.ts';
import type { AxisKind, CrystalTable } from './crystal-table.ts';
import { cellVolumePerEv3, columnsOf, formFactorPerResponse, rowsOf } from './crystal-table.ts';
import { rowFifthPowersEv5, rowMomentaEv } from './fifth-power.ts';
import { kramersKronig } from './kramers-kronig.ts';
import { energyMoments, fullResponseEv2 } from './sum-rule.ts';

export interface DielectricTable {
  readonly axes: AxisKind;
  /** Axes as in a crystal table, eV. */
  readonly momentumEv: Float64Array;
  readonly energyEv: Float64Array;
  /** Re ε and Im ε, row-major, one row a momentum; Im ε ≥ 0. */
  readonly real: Float64Array;
  readonly imaginary: Float64Array;
  readonly cellMassEv: number;
  readonly cellVolumeAngstrom3: number;
}

/** A pole that stands for strength above the table: it adds (2/π) weight/(E_p² − E²) to K(E), as g = weight δ(E − E_p)/E_p would. */
export interface MissingPole {
  /** ∫ E g dE above the table, eV². */
  readonly weightEv2: number;
  readonly energyEv: number;
}

/** Bounds of a pole's energy in units of T or, where that is higher, of the Bethe ridge: closer, it would show as a divergence. */
const CLOSEST_POLE = 1.2;
const FARTHEST_POLE = 4;
/** Part of the energy axis, below T, over which the response at T is averaged. */
const TOP_STRIP = 0.1;

/**
 * W ⟨E⁻²⟩ of strength W = ∫ E g dE above T that joins a response A at T, in the middle between two shapes:
 *
 *   a tail A (T/E)ⁿ with n = 2 + A T²/W                                            A/n
 *   A up to X, then A (X/E)⁴ as of a Lorentz oscillator, X² = W/A + T²/2           A [ln(X/T) + ¼]
 *
 * A steep tail (n ≥ 4: a valence band) is the only one that fits; shells that open near T (n → 2) lie between the two. The middle is a
 * choice, made because it brings germanium's and gallium arsenide's screened tables within 6 % of the static ε of their unscreened
 * ones; it moves ε(0) of an unscreened table by less than 0.3 %.
 */
function staticWeights(weightEv2: number, atTop: number, topEv: number): { tail: number; shell: number } {
  const scale = (atTop * topEv * topEv) / weightEv2;
  const tail = atTop / (2 + scale);
  return { tail, shell: scale < 2 ? atTop * (Math.log(1 / scale + 0.5) / 2 + 0.25) : tail };
}

/**
 * The strength each row of a response (Im ε or Im[−1/ε]; shape of `table`) lacks of π ω_p²/2, as one pole. It has the mean of E⁻²
 * that `staticWeights` finds from the mean response over the last tenth of the energy axis (`shape` picks one of its two
 * limits), between 1.2 and 4 times T or the Bethe ridge q²/2mₑ, whichever is higher. A row with more than its share lacks
 * nothing.
 */
export function missingPoles(
  table: CrystalTable,
  response: Float64Array,
  electronsPerCell: number,
  shape: 'middle' | 'tail' | 'shell' = 'middle',
): MissingPole[] {
  const full = fullResponseEv2(electronsPerCell, cellVolumePerEv3(table));
  const top = table.energyEv[table.energyEv.length - 1];
  const momenta = rowMomentaEv(table);
  const columns = columnsOf(table);
  const strip = columns - Math.max(1, Math.round(TOP_STRIP * columns));
  return Array.from(energyMoments(table, response), (moment, i) => {
    const weightEv2 = Math.max(0, full - moment);
    const unit = Math.max(top, momenta[i] ** 2 / (2 * ELECTRON_MASS_EV));
    const last = response.subarray(i * columns + strip, (i + 1) * columns);
    const { tail, shell } = staticWeights(weightEv2, last.reduce((a, b) => a + b, 0) / last.length, top);
    const weight = { tail, shell, middle: (tail + shell) / 2 }[shape];
    const energyEv = Math.min(Math.max(Math.sqrt(weightEv2 / weight) || 0, CLOSEST_POLE * unit), FARTHEST_POLE * unit);
    return { weightEv2, energyEv };
  });
}

/**
 * The response that a |f|² table stands for, row by row: |f|² / (q⁵ V/(8π² α² mₑ²)), with the cell mean of q⁵ for edges. A
 * sample at q = 0, where |f|² says nothing, takes the row above it. A table that holds a response already gives a copy of it.
 *
 * @throws DomainError without a cell volume
 */
export function responseOf(table: CrystalTable): Float64Array {
  requirePositive('cellVolume', table.cellVolumeAngstrom3 ?? Number.NaN);
  const response = Float64Array.from(table.values);
  if (table.quantity !== 'formFactorSquared') return response;
  const factor = formFactorPerResponse(table);
  const columns = columnsOf(table);
  rowFifthPowersEv5(table).forEach((power, i) => {
    const row = response.subarray(i * columns, (i + 1) * columns);
    for (let j = 0; j < columns; j++) row[j] /= factor * power;
  });
  if (table.axes === 'points' && table.momentumEv[0] === 0) response.copyWithin(0, columns, 2 * columns);
  return response;
}

/**
 * K(E), as in crystal/kramers-kronig, of a response with its missing strength. Without `electronsPerCell` nothing is known to be
 * missing and nothing is added.
 */
export function dispersionOf(
  table: CrystalTable,
  response: Float64Array,
  electronsPerCell: number | undefined,
): Float64Array {
  const { axes, energyEv } = table;
  const dispersion = kramersKronig(axes, energyEv, response, rowsOf(table));
  if (electronsPerCell === undefined) return dispersion;
  const columns = columnsOf(table);
  missingPoles(table, response, electronsPerCell).forEach((pole, i) => {
    for (let j = 0; j < columns; j++) {
      const e = axes === 'edges' ? (energyEv[j] + energyEv[j + 1]) / 2 : energyEv[j];
      dispersion[i * columns + j] += poleDispersion(pole, e);
    }
  });
  return dispersion;
}

/** What a pole adds to K at energy E, eV. */
export function poleDispersion({ weightEv2, energyEv }: MissingPole, atEv: number): number {
  return (2 / Math.PI) * (weightEv2 / (energyEv * energyEv - atEv * atEv));
}

/**
 * ε(q, E) of an unscreened table: Im ε from |f|², Re ε = 1 + K[Im ε], on the table's own axes (at the middles of cells, or the
 * points). `electronsPerCell` fixes the strength above the table.
 *
 * Accuracy: rounding for the table as defined, but for the pole (test/physics/crystal/dielectric.test.ts: Lorentz and Drude
 * oscillators, the built-in tables).
 *
 * @throws DomainError for a loss function, which is screened, or without a cell volume
 */
export function dielectricOf(table: CrystalTable, electronsPerCell: number | undefined): DielectricTable {
  if (table.quantity === 'lossFunction')
    throw new DomainError('quantity', table.quantity, 'an unscreened form factor; a loss function is screened already');
  const imaginary = responseOf(table);
  return {
    axes: table.axes,
    momentumEv: table.momentumEv,
    energyEv: table.energyEv,
    real: dispersionOf(table, imaginary, electronsPerCell).map((k) => 1 + k),
    imaginary,
    cellMassEv: table.cellMassEv,
    cellVolumeAngstrom3: table.cellVolumeAngstrom3!,
  };
}

/** The unscreened table of a dielectric function: it holds Im ε, and the powers of q stay inside the rate integral. */
export function unscreenedTable(dielectric: DielectricTable): CrystalTable {
  return tableWith(dielectric, 'imaginaryDielectric', dielectric.imaginary);
}

/** The screened table of a dielectric function: it holds the loss function Im[−1/ε] = Im ε/|ε|². */
export function screenedTable(dielectric: DielectricTable): CrystalTable {
  const { real, imaginary } = dielectric;
  return tableWith(
    dielectric,
    'lossFunction',
    imaginary.map((im, i) => (im === 0 ? 0 : im / (real[i] * real[i] + im * im))),
  );
}

function tableWith(
  dielectric: DielectricTable,
  quantity: CrystalTable['quantity'],
  values: Float64Array,
): CrystalTable {
  const { axes, momentumEv, energyEv, cellMassEv, cellVolumeAngstrom3 } = dielectric;
  return { axes, quantity, momentumEv, energyEv, values, cellMassEv, cellVolumeAngstrom3 };
}

/**
 * The screened twin of an unscreened table, on the same axes: |f|²/|ε|² with ε from `dielectricOf`. A table of Im ε becomes one of
 * the loss function.
 *
 * Accuracy against the built-in screened tables, computed with bands up to 70–110 eV: test/physics/crystal/dielectric.test.ts.
 *
 * @throws DomainError as `dielectricOf`
 */
export function screenedTwin(table: CrystalTable, electronsPerCell: number | undefined): CrystalTable {
  const { real, imaginary } = dielectricOf(table, electronsPerCell);
  const values = table.values.map((value, i) => (value === 0 ? 0 : value / (real[i] ** 2 + imaginary[i] ** 2)));
  return { ...table, values, quantity: table.quantity === 'formFactorSquared' ? table.quantity : 'lossFunction' };
}
