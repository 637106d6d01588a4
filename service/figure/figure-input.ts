/** What a reach figure is made of, and what of that cannot be drawn. */
import { DomainError } from '../../physics/errors.ts';
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';
import { CURVE_STYLES, REFERENCE_DASHES } from './line-style.ts';
import type { AxisRange } from './log-axis.ts';

export interface FigureCurve {
  readonly name: string;
  /** In any order. */
  readonly points: readonly CurvePoint[];
  /** The exact mass, MeV, below which nothing is reached; marked where the figure shows it. */
  readonly lightestMassMev?: number | undefined;
}

export interface FigureBand {
  readonly name: string;
  /** In any order; null where a bound does not exist. */
  readonly points: readonly {
    readonly massMev: number;
    readonly lowestCm2: number | null;
    readonly highestCm2: number | null;
  }[];
}

export interface ReachFigure {
  readonly title: string;
  readonly subtitle?: string | undefined;
  /** Below everything; default: that these are planning estimates. */
  readonly note?: string | undefined;
  /** 1 to 8. */
  readonly curves: readonly FigureCurve[];
  /** Up to 4, muted, behind. */
  readonly references?: readonly FigureCurve[] | undefined;
  readonly band?: FigureBand | undefined;
  /** What the vertical axis shows, cm²; default everything. */
  readonly crossSectionRangeCm2?: AxisRange | undefined;
  /** Default 720. */
  readonly widthPx?: number | undefined;
  /** Default what the contents take. */
  readonly heightPx?: number | undefined;
}

/**
 * @throws DomainError for no curve or more than 8, more than 4 references, curves without points, and numbers outside 1e-250…1e250
 */
export function checkFigure({
  curves,
  references = [],
  band,
  crossSectionRangeCm2,
  widthPx,
  heightPx,
}: ReachFigure): void {
  if (!(curves.length >= 1 && curves.length <= CURVE_STYLES.length))
    throw new DomainError('curves', curves.length, `from 1 to ${CURVE_STYLES.length} curves`);
  if (references.length > REFERENCE_DASHES.length)
    throw new DomainError('references', references.length, `at most ${REFERENCE_DASHES.length} curves`);
  curves.forEach((curve, i) => void checkCurve(['curves', i], curve));
  references.forEach((curve, i) => void checkCurve(['references', i], curve));
  band?.points.forEach(({ massMev, lowestCm2, highestCm2 }, i) => {
    for (const value of [massMev, lowestCm2 ?? 1, highestCm2 ?? 1]) requireDrawable(['band', 'points', i], value);
  });
  if (crossSectionRangeCm2) {
    const { from, to } = crossSectionRangeCm2;
    requireDrawable(['crossSectionRangeCm2', 'from'], from);
    requireDrawable(['crossSectionRangeCm2', 'to'], to);
    if (!(from < to)) throw new DomainError(['crossSectionRangeCm2', 'to'], to, `above ${from}`);
  }
  requireDrawable(['widthPx'], widthPx ?? 1);
  requireDrawable(['heightPx'], heightPx ?? 1);
}

/** So that a little room around them is still a number. */
const [SMALLEST, LARGEST] = [1e-250, 1e250];

function checkCurve(path: readonly (string | number)[], { points, lightestMassMev }: FigureCurve): void {
  if (points.length === 0) throw new DomainError([...path, 'points'], 0, 'at least one point');
  points.forEach(({ massMev, crossSectionCm2 }, i) => {
    requireDrawable([...path, 'points', i, 'mass'], massMev);
    requireDrawable([...path, 'points', i, 'crossSection'], crossSectionCm2 ?? 1);
  });
  requireDrawable([...path, 'lightestMassMev'], lightestMassMev ?? 1);
}

function requireDrawable(path: readonly (string | number)[], value: number): void {
  if (!(value >= SMALLEST && value <= LARGEST)) throw new DomainError(path, value, `from ${SMALLEST} to ${LARGEST}`);
}

export function byMass<P extends { readonly massMev: number }>(points: readonly P[]): P[] {
  return [...points].sort((a, b) => a.massMev - b.massMev);
}
