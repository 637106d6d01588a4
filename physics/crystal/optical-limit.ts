/**
 * What a table says of the crystal at small momentum, where handbooks can be asked: the static dielectric constant and the plasmon.
 *
 *   unscreened   ε(0) = 1 + (2/π) ∫ Im ε/E dE
 *   screened     1/ε(0) = 1 − (2/π) ∫ Im[−1/ε]/E dE
 *   plasmon      the peak of Im[−1/ε]
 *
 * Strength above the table's last energy adds to both integrals; where it lies is not known, so a range comes with the value
 * (crystal/dielectric, `missingPoles`).
 */
import { REFERENCE_MOMENTUM_EV } from '../constants.ts';
import { median } from '../numeric/median.ts';
import { type CrystalTable, columnsOf } from './crystal-table.ts';
import { dispersionOf, missingPoles, poleDispersion, responseOf } from './dielectric.ts';
import { rowMomentaEv } from './fifth-power.ts';
import { staticKramersKronig } from './kramers-kronig.ts';
import { sumRule } from './sum-rule.ts';

export interface OpticalLimit {
  /** The momentum at which it was read, eV. */
  readonly momentumEv: number;
  /** ∫ g/E dE · 2/π of the table's response g without anything added: at most 1 for a loss function, ε(0) − 1 for Im ε. */
  readonly staticIntegral: number;
  /** ε(0), and between what it lies for the strength above the table; undefined where the screened numbers allow none (1/ε ≤ 0). */
  readonly staticDielectric: { readonly value: number; readonly from: number; readonly to: number } | undefined;
  /** Energy of the highest loss, averaged over half an electronvolt, eV; undefined where the highest is at an end of the axis. */
  readonly plasmonEv: number | undefined;
}

/** Beyond this momentum neither quantity is that of the optical limit. */
const LARGEST_MOMENTUM_EV = 0.2 * REFERENCE_MOMENTUM_EV;
/** A row is reliable if its f-sum share is this close to the median of it and of as many rows above it. */
const RELIABLE = 0.05;
const NEIGHBOURS = 10;
/** Width over which the loss is averaged before its peak is looked for, eV. */
const PEAK_WIDTH_EV = 0.5;

/**
 * The optical limit of the lowest reliable row: one below 0.2 α mₑ whose f-sum share is within 5 % of what the ten rows
 * above it have. Undefined where there is none, or no cell volume. Without `electronsPerCell` nothing is added above the
 * table.
 *
 * Achieved for the built-in tables: test/physics/crystal/optical-limit.test.ts.
 */
export function opticalLimit(
  table: CrystalTable,
  screened: boolean,
  electronsPerCell: number | undefined,
): OpticalLimit | undefined {
  if (table.cellVolumeAngstrom3 === undefined) return undefined;
  const row = lowestReliableRow(table, electronsPerCell);
  if (!row) return undefined;
  const response = responseOf(row);
  const loss = screened ? response : lossOf(row, response, electronsPerCell);
  const [integral] = staticKramersKronig(row.axes, row.energyEv, response, 1);
  return {
    momentumEv: rowMomentaEv(row)[0],
    staticIntegral: integral,
    staticDielectric: staticDielectric(row, response, integral, screened, electronsPerCell),
    plasmonEv: peakEv(row, loss),
  };
}

function staticDielectric(
  row: CrystalTable,
  response: Float64Array,
  integral: number,
  screened: boolean,
  electronsPerCell: number | undefined,
): OpticalLimit['staticDielectric'] {
  const [value, tail, shell] = (['middle', 'tail', 'shell'] as const).map((shape) => {
    const [pole] = electronsPerCell === undefined ? [] : missingPoles(row, response, electronsPerCell, shape);
    const k = integral + (pole ? poleDispersion(pole, 0) : 0);
    return screened ? 1 / (1 - k) : 1 + k;
  });
  const all = [value, tail, shell];
  if (!all.every((epsilon) => epsilon > 0 && epsilon < Infinity)) return undefined;
  return { value, from: Math.min(...all), to: Math.max(...all) };
}

/** A table of one row, the lowest reliable one. */
function lowestReliableRow(table: CrystalTable, electronsPerCell: number | undefined): CrystalTable | undefined {
  const rule = sumRule(table, electronsPerCell ?? 1);
  const at = rule.share.findIndex((share, i) => {
    const usual = median(rule.share.subarray(i, i + 1 + NEIGHBOURS));
    return share > 0 && Math.abs(share / usual - 1) < RELIABLE;
  });
  if (at < 0 || rule.momentumEv[at] > LARGEST_MOMENTUM_EV) return undefined;
  const i = rowMomentaEv(table).indexOf(rule.momentumEv[at]);
  const columns = columnsOf(table);
  return {
    ...table,
    momentumEv: table.momentumEv.slice(i, table.axes === 'edges' ? i + 2 : i + 1),
    values: table.values.slice(i * columns, (i + 1) * columns),
  };
}

/** Im[−1/ε] of a row of Im ε. */
function lossOf(row: CrystalTable, imaginary: Float64Array, electronsPerCell: number | undefined): Float64Array {
  const dispersion = dispersionOf(row, imaginary, electronsPerCell);
  return imaginary.map((im, j) => (im === 0 ? 0 : im / ((1 + dispersion[j]) ** 2 + im * im)));
}

function peakEv({ axes, energyEv }: CrystalTable, loss: Float64Array): number | undefined {
  const middles = loss.map((_, j) => (axes === 'edges' ? (energyEv[j] + energyEv[j + 1]) / 2 : energyEv[j]));
  const spacing = (middles[middles.length - 1] - middles[0]) / (middles.length - 1);
  const half = Math.floor(PEAK_WIDTH_EV / spacing / 2);
  const averaged = loss.map((_, j) => {
    const near = loss.subarray(Math.max(0, j - half), j + half + 1);
    return near.reduce((a, b) => a + b, 0) / near.length;
  });
  const peak = averaged.indexOf(averaged.reduce((a, b) => Math.max(a, b), 0));
  return peak > 0 && peak < averaged.length - 1 ? middles[peak] : undefined;
}
