/** A comparison of two reach curves as CSV, one row a mass, also for masses that only one side has. */
import type { ComparedPoint, OneSidedPoint, ReachComparison } from '../../physics/reach/comparison.ts';
import { csvRow } from './csv-row.ts';

interface Row {
  readonly massMev: number;
  readonly baselineCm2: number | null;
  readonly candidateCm2: number | null;
  readonly ratio: number | null;
  readonly remark: string;
}

export function comparisonCsv(comparison: ReachComparison): string {
  const header = csvRow([
    'mass (MeV)',
    'baseline cross section (cm^2)',
    'candidate cross section (cm^2)',
    'ratio candidate/baseline',
    'remark',
  ]);
  const rows = rowsOf(comparison).map((row) =>
    csvRow([row.massMev, row.baselineCm2, row.candidateCm2, row.ratio, row.remark]),
  );
  return header + rows.join('');
}

/** Ascending in mass. */
function rowsOf({ points, onlyBaseline, onlyCandidate }: ReachComparison): Row[] {
  const oneSided = new Map([...onlyBaseline, ...onlyCandidate].map((point) => [point.massMev, point]));
  const isOutside = ({ reason }: OneSidedPoint): boolean => reason === 'outside';
  return [
    ...points.map((point) => ({ ...point, remark: remarkOf(point, oneSided.get(point.massMev)) })),
    ...onlyBaseline.filter(isOutside).map((point) => outsideRow(point, 'baselineCm2')),
    ...onlyCandidate.filter(isOutside).map((point) => outsideRow(point, 'candidateCm2')),
  ].sort((a, b) => a.massMev - b.massMev);
}

function outsideRow({ massMev, crossSectionCm2 }: OneSidedPoint, side: 'baselineCm2' | 'candidateCm2'): Row {
  const none = { massMev, baselineCm2: null, candidateCm2: null, ratio: null };
  const other = side === 'baselineCm2' ? 'candidate' : 'baseline';
  return { ...none, [side]: crossSectionCm2, remark: `outside the masses of the ${other}` };
}

function remarkOf(point: ComparedPoint, oneSided: OneSidedPoint | undefined): string {
  if (oneSided) {
    const other = point.baselineCm2 === null ? 'baseline' : 'candidate';
    return oneSided.reason === 'undecided'
      ? `the ${other} ends between its masses here`
      : `the ${other} does not reach this mass`;
  }
  return point.interpolated === undefined || point.ratio === null ? '' : `${point.interpolated} interpolated`;
}
