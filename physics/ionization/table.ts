/**
 * A tabulated ionization model: P(n|E) at given energies, linear in E between them. Outside its energies the table says nothing
 * and no charge is counted there; that charge, and what a row lacks of 1, is lost, and `lostFraction` says how much.
 */
import { DomainError } from '../errors.ts';
import { intervalOf } from '../numeric/interval.ts';
import type { IonizationModel } from './ionization-model.ts';

export interface IonizationTable {
  /** Energies in the crystal, eV, ≥ 0, strictly increasing, at least two. */
  readonly energiesEv: readonly number[];
  /** A row for each energy; column n − 1 holds P(n|E), n = 1, 2, … */
  readonly probabilities: readonly (readonly number[])[];
  /** Lowest energy that frees an electron, eV, ≥ 0. */
  readonly bandGapEv: number;
}

/** One thing wrong with a table, and where in it. */
export interface TableFault {
  readonly path: readonly (string | number)[];
  readonly detail: string;
}

/** How far a row's sum may pass 1: rounding of numbers that were normalised elsewhere. */
const SUM_TOLERANCE = 1e-9;

/** Everything that is wrong with a table, in its own order; empty for a good one. */
export function tableFaults(table: IonizationTable): TableFault[] {
  const { energiesEv, probabilities, bandGapEv } = table;
  const faults: TableFault[] = [];
  const fault = (path: readonly (string | number)[], detail: string): void => void faults.push({ path, detail });

  if (!isNonNegative(bandGapEv)) fault(['bandGap'], `${bandGapEv}: a finite number of at least 0`);
  if (energiesEv.length < 2) fault(['energies'], `${energiesEv.length} energies: at least 2`);
  energiesEv.forEach((energy, i) => {
    if (!isNonNegative(energy)) fault(['energies', i], `${energy}: a finite number of at least 0`);
    else if (energy <= energiesEv[i - 1])
      fault(['energies', i], `${energy}: above the one before, ${energiesEv[i - 1]}`);
  });
  if (probabilities.length !== energiesEv.length) {
    fault(['probabilities'], `${probabilities.length} rows: one for each of ${energiesEv.length} energies`);
  }
  const columns = probabilities[0]?.length ?? 0;
  probabilities.forEach((row, i) => {
    if (row.length === 0) fault(['probabilities', i], 'no values: at least P(1|E)');
    else if (row.length !== columns)
      fault(['probabilities', i], `${row.length} values: ${columns} as in the first row`);
    const wrong = row.flatMap((p, n) => (isNonNegative(p) ? [] : [n]));
    for (const n of wrong) fault(['probabilities', i, n], `${row[n]}: a probability of at least 0`);
    const sum = row.reduce((a, b) => a + b, 0);
    if (wrong.length === 0 && sum > 1 + SUM_TOLERANCE) fault(['probabilities', i], `sums to ${sum}: at most 1`);
    if (wrong.length === 0 && sum > 0 && energiesEv[i] < bandGapEv) {
      fault(['probabilities', i], `charge at ${energiesEv[i]} eV: none below the band gap, ${bandGapEv} eV`);
    }
  });
  return faults;
}

function isNonNegative(value: number): boolean {
  return value >= 0 && value < Infinity;
}

/**
 * The model. Its breaks are the table's energies and a division of every interval in which P changes (see `changingIntervalCuts`).
 * No row is renormalised.
 *
 * @throws DomainError with the first of `tableFaults`; a caller that wants them all asks that function before.
 * @example tableIonization({ energiesEv: [1.12, 4.92], probabilities: [[1, 0], [0, 1]], bandGapEv: 1.12 })
 */
export function tableIonization(table: IonizationTable): IonizationModel {
  const [first] = tableFaults(table);
  if (first) throw new DomainError(first.path, undefined, first.detail);
  const { probabilities, bandGapEv } = table;
  const energies = Float64Array.from(table.energiesEv);
  const columns = probabilities[0].length;
  const last = energies[energies.length - 1];
  const sums = Float64Array.from(probabilities, (row) => row.reduce((a, b) => a + b, 0));
  const cuts = changingIntervalCuts(energies, probabilities, sums);
  const covers = (energyEv: number): boolean => energyEv >= bandGapEv && energyEv >= energies[0] && energyEv <= last;

  return {
    bandGapEv,
    maxSegmentEv: Infinity, // the breaks are fine enough
    segmentError: SEGMENT_ERROR,
    breaksEv: (fromEv, toEv) => cuts.filter((e) => e > fromEv && e < toEv),
    probabilities(energyEv, out) {
      out.fill(0);
      if (!covers(energyEv)) return;
      const i = intervalOf(energies, energyEv);
      const t = (energyEv - energies[i]) / (energies[i + 1] - energies[i]);
      const count = Math.min(columns, out.length);
      for (let n = 0; n < count; n++) out[n] = probabilities[i][n] * (1 - t) + probabilities[i + 1][n] * t;
    },
    reachEv: () => last,
    lostFraction(energyEv) {
      if (energyEv < bandGapEv) return 0;
      if (!covers(energyEv)) return 1;
      const i = intervalOf(energies, energyEv);
      const t = (energyEv - energies[i]) / (energies[i + 1] - energies[i]);
      return Math.max(0, 1 - sums[i] * (1 - t) - sums[i + 1] * t);
    },
  };
}

/** 1e-5 measured, see changingIntervalCuts. */
const SEGMENT_ERROR = 2e-5;
/** Segments to the mean width of a bin, and at most to the whole axis. */
const SEGMENTS_PER_BIN = 96;
const MOST_SEGMENTS = 20_000;

/**
 * The table's energies, eV, and between two rows that differ, cuts no further apart than h = W/96, W = ∫ Σ P(n|E) dE / columns the
 * mean width of a bin in energy. For P a line, the middle's weight errs by h²/12 times the slopes of P and of the spectrum: 1e-5
 * of a bin for a spectrum that falls as exp(−E/W) (measured, test/physics/ionization/table.test.ts).
 */
function changingIntervalCuts(
  energies: Float64Array,
  probabilities: readonly (readonly number[])[],
  sums: Float64Array,
): number[] {
  let area = 0;
  for (let i = 1; i < energies.length; i++) area += ((sums[i] + sums[i - 1]) / 2) * (energies[i] - energies[i - 1]);
  const filled = probabilities[0].filter((_, n) => probabilities.some((row) => row[n] > 0)).length;
  const span = energies[energies.length - 1] - energies[0];
  const widest = Math.max(area / Math.max(1, filled) / SEGMENTS_PER_BIN, span / MOST_SEGMENTS);

  const cuts = [energies[0]];
  for (let i = 1; i < energies.length; i++) {
    const width = energies[i] - energies[i - 1];
    const changes = probabilities[i].some((p, n) => p !== probabilities[i - 1][n]);
    const pieces = changes ? Math.ceil(width / widest) : 1;
    for (let p = 1; p < pieces; p++) cuts.push(energies[i - 1] + (width * p) / pieces);
    cuts.push(energies[i]);
  }
  return cuts;
}
