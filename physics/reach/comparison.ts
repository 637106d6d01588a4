/**
 * Two reach curves against each other: the ratio candidate/baseline of their smallest cross sections at each mass, below 1 where the
 * candidate reaches further, and what that amounts to.
 *
 * Where: at every mass of either curve that lies in the range of both, ends included. Where only one curve has the mass, the other is
 * interpolated, ln σ̄ₑ linear in ln m between its two neighbours (exact for power laws).
 *
 * Interpolation never crosses a gap. Between two masses that are not reached, nothing is taken to be reached; between a reached and an
 * unreached one the edge of the reach lies somewhere, and nothing is concluded there.
 */
import { DomainError, requireNonNegative } from '../errors.ts';
import type { CurvePoint } from './mass-grid.ts';

export type Verdict = 'better' | 'same' | 'worse' | 'mixed';
export type Side = 'baseline' | 'candidate';

export interface ComparedPoint {
  readonly massMev: number;
  readonly baselineCm2: number | null;
  readonly candidateCm2: number | null;
  /** candidate/baseline; null where either has none. */
  readonly ratio: number | null;
  /** The side whose grid does not have this mass. */
  readonly interpolated?: Side;
}

/** A mass that only one side reaches. */
export interface OneSidedPoint {
  readonly massMev: number;
  readonly crossSectionCm2: number;
  /**
   * Why the other side has none: `unreachable`, its goal is not reached at this mass; `undecided`, it lies between a mass it reaches and one
   * it does not; `outside`, its masses end before.
   */
  readonly reason: 'unreachable' | 'undecided' | 'outside';
}

export interface RatioAt {
  readonly massMev: number;
  readonly ratio: number;
}

export interface ReachComparison {
  readonly verdict: Verdict;
  /** Ascending in mass. */
  readonly points: readonly ComparedPoint[];
  /** Smallest ratio below 1 and largest above 1, of equal ones at the lightest mass; null where there is none. */
  readonly largest: { readonly gain: RatioAt | null; readonly loss: RatioAt | null };
  readonly onlyBaseline: readonly OneSidedPoint[];
  readonly onlyCandidate: readonly OneSidedPoint[];
  /** Range of both curves, MeV; null where they do not meet. */
  readonly commonRangeMev: { readonly from: number; readonly to: number } | null;
  /** Points at which one side was interpolated. */
  readonly interpolatedPoints: number;
  /** Points at which both sides are known, reached or not: what the verdict rests on. */
  readonly knownPoints: number;
}

/** Masses this near, relative, are one mass written twice; ratios this near to a bound lie on it. */
const ROUNDING = 1e-12;

/**
 * Compares two curves; the order of their points does not matter. Swapped curves give inverse ratios and the opposite verdict.
 *
 * The verdict weighs every mass at which both sides are known. A ratio beyond the tolerance, |ln ratio| > ln(1 + tolerance), speaks for
 * or against the candidate, and so does a mass that one side reaches and the other does not (`unreachable`): any gain or loss of reach is
 * beyond any tolerance. Only gains: `better`; only losses: `worse`; both: `mixed`; neither: `same`. `outside` and `undecided` masses do
 * not count. Curves with no mass at which both are known are `mixed`, because nothing shows that they are the same.
 *
 * @param tolerance ≥ 0. @throws DomainError for that, and for curves that are empty or have a mass or a cross section not above 0.
 * @example compareReach([{ massMev: 1, crossSectionCm2: 2e-38 }], [{ massMev: 1, crossSectionCm2: 1e-38 }], 0.05).verdict // 'better'
 */
export function compareReach(
  baseline: readonly CurvePoint[],
  candidate: readonly CurvePoint[],
  tolerance: number,
): ReachComparison {
  requireNonNegative('tolerance', tolerance);
  const before = curveOf('baseline', baseline);
  const after = curveOf('candidate', candidate);
  const masses = massesOfBoth(before, after).map((massMev) => ({
    before: before.at(massMev),
    after: after.at(massMev),
    massMev,
  }));
  const common = masses.filter((m) => m.before.known !== 'outside' && m.after.known !== 'outside');
  const points = common.map(comparedPoint);
  const changes = common.map((both) => changeAt(both, tolerance)).filter((change) => change !== undefined);
  return {
    verdict: verdictOf(changes),
    points,
    largest: largestOf(points),
    onlyBaseline: masses.flatMap((m) => oneSided(m.massMev, m.before, m.after)),
    onlyCandidate: masses.flatMap((m) => oneSided(m.massMev, m.after, m.before)),
    commonRangeMev: points.length > 0 ? { from: points[0].massMev, to: points[points.length - 1].massMev } : null,
    interpolatedPoints: points.filter((point) => point.interpolated !== undefined).length,
    knownPoints: changes.length,
  };
}

/** What one curve says of a mass. */
type Reading =
  | { readonly known: 'reached'; readonly crossSectionCm2: number; readonly isInterpolated: boolean }
  | { readonly known: 'unreachable' | 'undecided'; readonly isInterpolated: boolean }
  | { readonly known: 'outside'; readonly isInterpolated: false };

interface Curve {
  /** Ascending, each once. */
  readonly massesMev: readonly number[];
  at(massMev: number): Reading;
}

interface BothReadings {
  readonly massMev: number;
  readonly before: Reading;
  readonly after: Reading;
}

function curveOf(side: Side, points: readonly CurvePoint[]): Curve {
  if (points.length === 0) throw new DomainError(side, 0, 'at least one point');
  points.forEach(({ massMev, crossSectionCm2 }, i) => {
    if (!(massMev > 0 && massMev < Infinity))
      throw new DomainError([side, i, 'mass'], massMev, 'a finite number above 0');
    if (crossSectionCm2 !== null && !(crossSectionCm2 > 0 && crossSectionCm2 < Infinity))
      throw new DomainError([side, i, 'crossSection'], crossSectionCm2, 'a finite number above 0, or null');
  });
  const sorted = [...points].sort((a, b) => a.massMev - b.massMev);
  const distinct = sorted.filter((point, i) => i === 0 || !isSameMass(sorted[i - 1].massMev, point.massMev));
  return { massesMev: distinct.map((point) => point.massMev), at: (massMev) => readingAt(distinct, massMev) };
}

function isSameMass(one: number, other: number): boolean {
  return Math.abs(one - other) <= ROUNDING * one;
}

/** All masses, ascending; one that both curves have, once. */
function massesOfBoth(before: Curve, after: Curve): number[] {
  const all = [...before.massesMev, ...after.massesMev].sort((a, b) => a - b);
  return all.filter((mass, i) => i === 0 || !isSameMass(all[i - 1], mass));
}

function readingAt(points: readonly CurvePoint[], massMev: number): Reading {
  const next = points.findIndex((point) => point.massMev > massMev || isSameMass(point.massMev, massMev));
  if (next < 0) return { known: 'outside', isInterpolated: false };
  if (isSameMass(points[next].massMev, massMev)) return readingOf(points[next].crossSectionCm2, false);
  if (next === 0) return { known: 'outside', isInterpolated: false };
  const [left, right] = [points[next - 1], points[next]];
  if (left.crossSectionCm2 === null || right.crossSectionCm2 === null)
    return {
      known: left.crossSectionCm2 === right.crossSectionCm2 ? 'unreachable' : 'undecided',
      isInterpolated: true,
    };
  const share = Math.log(massMev / left.massMev) / Math.log(right.massMev / left.massMev);
  const lnSigma = (1 - share) * Math.log(left.crossSectionCm2) + share * Math.log(right.crossSectionCm2);
  return readingOf(Math.exp(lnSigma), true);
}

function readingOf(crossSectionCm2: number | null, isInterpolated: boolean): Reading {
  return crossSectionCm2 === null
    ? { known: 'unreachable', isInterpolated }
    : { known: 'reached', crossSectionCm2, isInterpolated };
}

function crossSectionOf(reading: Reading): number | null {
  return reading.known === 'reached' ? reading.crossSectionCm2 : null;
}

function comparedPoint({ massMev, before, after }: BothReadings): ComparedPoint {
  const [baselineCm2, candidateCm2] = [crossSectionOf(before), crossSectionOf(after)];
  const ratio = baselineCm2 === null || candidateCm2 === null ? null : candidateCm2 / baselineCm2;
  const point = { massMev, baselineCm2, candidateCm2, ratio };
  if (before.isInterpolated) return { ...point, interpolated: 'baseline' };
  return after.isInterpolated ? { ...point, interpolated: 'candidate' } : point;
}

function oneSided(massMev: number, here: Reading, there: Reading): OneSidedPoint[] {
  if (here.known !== 'reached' || there.known === 'reached') return [];
  return [{ massMev, crossSectionCm2: here.crossSectionCm2, reason: there.known }];
}

/** −1 for a gain, 1 for a loss, 0 for neither; undefined where one side is not known. */
function changeAt({ before, after }: BothReadings, tolerance: number): number | undefined {
  if (before.known === 'undecided' || after.known === 'undecided') return undefined;
  const [baseline, candidate] = [crossSectionOf(before), crossSectionOf(after)];
  if (baseline === null || candidate === null) return Math.sign(Number(candidate === null) - Number(baseline === null));
  const lnRatio = Math.log(candidate / baseline);
  return Math.abs(lnRatio) <= Math.log1p(tolerance) + ROUNDING ? 0 : Math.sign(lnRatio);
}

function verdictOf(changes: readonly number[]): Verdict {
  if (changes.length === 0) return 'mixed';
  const [gains, losses] = [changes.includes(-1), changes.includes(1)];
  if (gains && losses) return 'mixed';
  if (gains) return 'better';
  return losses ? 'worse' : 'same';
}

function largestOf(points: readonly ComparedPoint[]): ReachComparison['largest'] {
  let gain: RatioAt | null = null;
  let loss: RatioAt | null = null;
  for (const { massMev, ratio } of points) {
    if (ratio === null) continue;
    if (ratio < (gain?.ratio ?? 1 - ROUNDING)) gain = { massMev, ratio };
    if (ratio > (loss?.ratio ?? 1 + ROUNDING)) loss = { massMev, ratio };
  }
  return { gain, loss };
}
