/**
 * The double integral of the rate, for every energy segment s at once:
 *
 *   I_s = ∫_s dE ∫ dq q⁻² η(v_min(q, E)) |F_DM(q)|² |f(q, E)|²          dimensionless, η in units of 1/c
 *
 * Energy is exact (rate/panel-evaluator). Momentum is product integration over panels (rate/momentum-panel), adaptive: a panel
 * is halved until its estimated error is small in every group of segments.
 */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import { momentumRangeEv } from '../kinematics/kinematics.ts';
import { momentumPanel, panelBoundariesEv } from './momentum-panel.ts';
import type { RateIntegrand } from './panel-evaluator.ts';
import { panelEvaluator } from './panel-evaluator.ts';

export interface RateIntegral {
  /** I_s for every segment. */
  readonly perSegment: Float64Array;
  /** Estimated error of each group's sum, relative to that sum (0 where the sum is exactly 0). */
  readonly relativeErrors: readonly number[];
  /** Momentum panels evaluated. */
  readonly evaluations: number;
}

/** A panel is halved while its estimated error exceeds this share of any group's sum, divided by the number of panels. */
const TOLERANCE = 3e-4;
/** The error of the five-node rule is estimated as this times δ²/|S|, δ its difference from the three-node rule. */
const SAFETY = 20;
/** Where the integrand begins inside a panel, at the kinematic boundary, as this times δ: convergence is only algebraic there. */
const BEGINNING = 0.5;
/** What the tabulated tail of η and rounding add, relative: measured below 3e-8. */
const TAIL_ERROR = 1e-7;
/** No panel is wider than this share of the momentum window of any group it meets, so that no window is stepped over. */
const WINDOW_SHARE = 1 / 4;
const MOST_PANELS = 5000;
const MOST_ROUNDS = 16;

interface EvaluatedPanel {
  readonly fromEv: number;
  readonly toEv: number;
  readonly perSegment: Float64Array;
  /** Per group: Σ of the five-node rule, and its estimated error. */
  readonly sums: Float64Array;
  readonly errors: Float64Array;
}

/** Momenta the table covers out of those that the halo's kinematics allow at the lowest energy; undefined where there are none. */
export function coveredMomentaEv(
  integrand: Pick<RateIntegrand, 'table' | 'segments' | 'massEv' | 'splittingEv'>,
  largestSpeedKmPerS: number,
): { readonly fromEv: number; readonly toEv: number } | undefined {
  const axis = integrand.table.momentumEv;
  const allowed = momentumRangeEv(
    integrand.massEv,
    integrand.segments.cutsEv[0] + integrand.splittingEv,
    largestSpeedKmPerS / SPEED_OF_LIGHT_KM_PER_S,
  );
  if (!allowed) return undefined;
  const range = { fromEv: Math.max(allowed.fromEv, axis[0]), toEv: Math.min(allowed.toEv, axis[axis.length - 1]) };
  return range.fromEv < range.toEv ? range : undefined;
}

/**
 * Integrates. `groupStarts` are the first segments of the groups over which the error is controlled, ascending from 0; a group
 * ends where the next begins. `momenta` (eV, inside the table's axis, above 0) limits the momentum.
 *
 * Accuracy: within 2e-4 for every group above 1e-6 of the total, typically 1e-6; the error estimate is not below half the true
 * error (test/physics/rate/rate-integral.test.ts, against an independent integration).
 */
export function rateIntegral(
  integrand: RateIntegrand,
  groupStarts: readonly number[],
  largestSpeedKmPerS: number,
  momenta = coveredMomentaEv(integrand, largestSpeedKmPerS),
): RateIntegral {
  const { segments, table } = integrand;
  const perSegment = new Float64Array(segments.count);
  if (!momenta) return { perSegment, relativeErrors: groupStarts.map(() => 0), evaluations: 0 };

  const evaluator = panelEvaluator(integrand);
  const groupEnds = [...groupStarts.slice(1), segments.count];
  let evaluations = 0;

  const evaluate = (fromEv: number, toEv: number): EvaluatedPanel => {
    const { fromAll, fromAny } = evaluator.evaluate(momentumPanel(table, fromEv, toEv));
    evaluations++;
    const sums = new Float64Array(groupStarts.length);
    const errors = new Float64Array(groupStarts.length);
    for (let g = 0; g < groupStarts.length && groupStarts[g] < fromAny; g++) {
      let sum = 0;
      let smooth = 0;
      let beginning = 0;
      for (let s = groupStarts[g]; s < Math.min(groupEnds[g], fromAny); s++) {
        sum += evaluator.value[s];
        const difference = Math.abs(evaluator.difference[s]);
        // the last segment within reach of every node is cut by the kinematic boundary at one of them
        if (s < fromAll - 1) smooth += difference;
        else beginning += difference;
      }
      sums[g] = sum;
      errors[g] = Math.min(smooth, (SAFETY * smooth * smooth) / Math.abs(sum) || 0) + BEGINNING * beginning;
    }
    return { fromEv, toEv, perSegment: evaluator.value.slice(0, fromAny), sums, errors };
  };

  let panels: EvaluatedPanel[] = [];
  const boundaries = resolveWindows(
    panelBoundariesEv(momenta.fromEv, momenta.toEv),
    windowsOf(integrand, groupStarts, largestSpeedKmPerS),
  );
  for (let i = 1; i < boundaries.length; i++) panels.push(evaluate(boundaries[i - 1], boundaries[i]));

  const totals = new Float64Array(groupStarts.length);
  for (let round = 0; ; round++) {
    totals.fill(0);
    for (const panel of panels) for (let g = 0; g < totals.length; g++) totals[g] += panel.sums[g];
    if (round === MOST_ROUNDS || panels.length > MOST_PANELS) break;
    const share = TOLERANCE / panels.length;
    let halved = false;
    panels = panels.flatMap((panel) => {
      if (!panel.errors.some((error, g) => error > share * totals[g])) return [panel];
      const middle = (panel.fromEv + panel.toEv) / 2;
      if (!(middle > panel.fromEv && middle < panel.toEv)) return [panel];
      halved = true;
      return [evaluate(panel.fromEv, middle), evaluate(middle, panel.toEv)];
    });
    if (!halved) break;
  }

  const relativeErrors = groupStarts.map((_, g) => {
    const error = panels.reduce((sum, panel) => sum + panel.errors[g], 0);
    return totals[g] > 0 ? error / totals[g] + TAIL_ERROR : 0;
  });
  for (const panel of panels) for (let s = 0; s < panel.perSegment.length; s++) perSegment[s] += panel.perSegment[s];
  return { perSegment, relativeErrors, evaluations };
}

/** Momentum windows, eV, of the lowest energy of each group that can be reached. */
export function windowsOf(
  integrand: Pick<RateIntegrand, 'segments' | 'massEv' | 'splittingEv'>,
  groupStarts: readonly number[],
  largestSpeedKmPerS: number,
) {
  const { massEv, splittingEv, segments } = integrand;
  return groupStarts.flatMap(
    (s) =>
      momentumRangeEv(massEv, segments.cutsEv[s] + splittingEv, largestSpeedKmPerS / SPEED_OF_LIGHT_KM_PER_S) ?? [],
  );
}

/** Halves panels until none is wider than WINDOW_SHARE of a window it overlaps. */
export function resolveWindows(
  boundaries: readonly number[],
  windows: readonly { readonly fromEv: number; readonly toEv: number }[],
): number[] {
  const tooWide = (from: number, to: number): boolean =>
    windows.some((w) => w.fromEv < to && w.toEv > from && to - from > WINDOW_SHARE * (w.toEv - w.fromEv));
  const halves = (from: number, to: number): number[] => {
    const middle = (from + to) / 2;
    if (!tooWide(from, to) || !(middle > from && middle < to)) return [to];
    return [...halves(from, middle), ...halves(middle, to)];
  };
  return [boundaries[0], ...boundaries.slice(1).flatMap((to, i) => halves(boundaries[i], to))];
}
