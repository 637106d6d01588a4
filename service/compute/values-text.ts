/**
 * A whole table as text, in a form in which it can be posted: JSON, or CSV in matrix form. Some rows at a time, in a worker
 * thread: the text of a large table is longer than the longest string there is.
 */
import { matricesOf, shapeOf } from '../crystals/crystal-record.ts';
import type { CrystalHeader } from '../schemas/crystal.ts';

export interface ValuesJob {
  readonly header: CrystalHeader;
  readonly values: Float64Array;
  readonly format: 'json' | 'csv';
  /**
   * Rows from here up to there, the second not included; the first brings the beginning, the last the end. Those of the imaginary
   * part of a dielectric function follow those of the real one.
   */
  readonly from: number;
  readonly to: number;
}

export function valuesText(job: ValuesJob): Uint8Array {
  return new TextEncoder().encode(job.format === 'json' ? jsonText(job) : csvText(job));
}

function rowsOf({ header, values, from, to }: ValuesJob): Float64Array[] {
  const { columns } = shapeOf(header);
  return Array.from({ length: to - from }, (_, i) => values.subarray((from + i) * columns, (from + i + 1) * columns));
}

function jsonText(job: ValuesJob): string {
  const { header, from, to } = job;
  const isDielectric = header.quantity === 'dielectricFunction';
  const { rows } = shapeOf(header);
  const beginning = (): string =>
    `${JSON.stringify(describing(header)).slice(0, -1)},"${header.quantity}":${isDielectric ? '{"real":' : ''}[`;
  const before = (row: number): string => {
    if (row === 0) return beginning();
    return row === rows ? '],"imaginary":[' : ',';
  };
  const text = rowsOf(job).map((row, i) => before(from + i) + JSON.stringify(Array.from(row)));
  const isEnd = to === matricesOf(header) * rows;
  return text.join('') + (isEnd ? `]${isDielectric ? '}' : ''}}` : '');
}

/** What stands before the values. */
function describing(header: CrystalHeader): object {
  const quantity = (value: number | undefined, unit: string): string | undefined =>
    value === undefined ? undefined : `${value} ${unit}`;
  return {
    name: header.name,
    source: header.source,
    screened: header.screened,
    cellMass: quantity(header.cellMassGev, 'GeV'),
    cellVolume: quantity(header.cellVolumeAngstrom3, 'angstrom^3'),
    electronsPerCell: header.electronsPerCell,
    bandGap: quantity(header.bandGapEv, 'eV'),
    energyPerPair: quantity(header.energyPerPairEv, 'eV'),
    momentum: { unit: 'keV', [header.axes]: header.momentumKev },
    energy: { unit: 'eV', [header.axes]: header.energyEv },
  };
}

/** The corner names both axes; for cells the axes go on to the last edge, behind which there is nothing (crystals/upload/csv-values). */
function csvText(job: ValuesJob): string {
  const { header, from, to } = job;
  const { axes, momentumKev, energyEv } = header;
  const lines = rowsOf(job).map((row, i) => `${momentumKev[from + i]},${row.join(',')}${axes === 'edges' ? ',' : ''}`);
  if (from === 0) lines.unshift(`momentum (keV) \\ energy (eV),${energyEv.join(',')}`);
  const isEnd = to === shapeOf(header).rows;
  if (isEnd && axes === 'edges') lines.push(`${momentumKev[to]}${','.repeat(energyEv.length)}`);
  return `${lines.join('\r\n')}\r\n`;
}
