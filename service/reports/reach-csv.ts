/** A reach curve as CSV, one row a mass; rows can be sent as they are computed. */
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';
import { csvRow } from './csv-row.ts';

export interface ReachRow extends CurvePoint {
  /** Of the cross section; left empty where there is none. */
  readonly relativeError?: number | undefined;
  /** Events in the window. */
  readonly expectedSignal?: number | null | undefined;
  readonly expectedBackground?: number | null | undefined;
}

export function reachCsvHeader(): string {
  return csvRow([
    'mass (MeV)',
    'cross section (cm^2)',
    'relative error',
    'expected signal (events)',
    'expected background (events)',
  ]);
}

/** A mass that is not reached has empty cells but for its background. */
export function reachCsvRow(row: ReachRow): string {
  const { massMev, crossSectionCm2, relativeError, expectedSignal, expectedBackground } = row;
  return csvRow([
    massMev,
    crossSectionCm2,
    crossSectionCm2 === null ? null : relativeError,
    expectedSignal,
    expectedBackground,
  ]);
}

export function reachCsv(rows: readonly ReachRow[]): string {
  return reachCsvHeader() + rows.map(reachCsvRow).join('');
}
