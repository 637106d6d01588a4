/**
 * The smallest exposure from which a goal holds, from the rates per bin of the window.
 *
 * S: signal rate and B: background rate in the window, 1/(kg yr). X: exposure, kg yr. Every condition that is solved for rises with X,
 * so the first crossing is the only one. The conditions themselves: goal.ts.
 */
import { firstCrossing } from '../numeric/first-crossing.ts';
import { type AsimovByExposure, asimovDeviance, checkBins } from './asimov.ts';
import {
  type BindingCondition,
  binned,
  type Goal,
  type GoalCondition,
  goalCondition,
  sumOf,
  testedBins,
  totalOf,
  type WindowRates,
} from './goal.ts';

export {
  type Background,
  type BindingCondition,
  binned,
  DEFAULT_MINIMUM_EVENTS,
  type ExclusionMethod,
  type Goal,
  poolBinsWithoutBackground,
  type WindowRates,
} from './goal.ts';

export interface NeededExposure {
  /** null where no exposure reaches the goal: see `reason`. */
  readonly neededKgYr: number | null;
  /** Events in the window at that exposure. */
  readonly expectedSignal: number | null;
  readonly expectedBackground: number | null;
  /** Error of the exposure, relative: of the root, and of the mean limit where that is larger. */
  readonly relativeError: number;
  readonly binding: BindingCondition | null;
  /** `systematic-uncertainty`: the significance stays below `largestSignificance` at any exposure. */
  readonly reason?: 'no-signal' | 'systematic-uncertainty';
  /** √q (σ) as the exposure grows without end; only with that reason. */
  readonly largestSignificance?: number;
  /** √q (σ) the goal asks for; only with that reason. */
  readonly requiredSignificance?: number;
}

/** Half-width of the root in ln X. */
const ROOT_TOLERANCE = 1e-11;
/** A signal rate, 1/(kg yr) or relative to the background's, whose exposure would leave a double's range: none. */
const NEGLIGIBLE_SIGNAL = 1e-100;
/** A significance that has all but stopped rising with this many events expected is taken to stop for good. */
const SATURATION_EVENTS = 1e14;
/** … where its square would still rise by less than this share if the exposure were multiplied by e. */
const SATURATION_SHARE = 1e-3;

/**
 * The smallest exposure from which `goal` holds (its condition: goalCondition).
 *
 * A discovery's bins without background make √q unbounded from a certain exposure on (testedBins); that jump is the answer if the
 * other bins have not reached the goal before.
 *
 * @throws DomainError for numbers outside their domain, and for uncertain backgrounds with `counting` and `unified`.
 * @example
 * neededExposure({ signalPerKgYr: [2], backgrounds: [] }, { kind: 'exclusion', confidence: 0.9 }).neededKgYr // 1.1513
 */
export function neededExposure(window: WindowRates, goal: Goal): NeededExposure {
  checkBins(window.signalPerKgYr, binned(window));
  const condition = goalCondition(goal, window.backgrounds);
  const signal = sumOf(window.signalPerKgYr);
  if (signal < NEGLIGIBLE_SIGNAL || signal < NEGLIGIBLE_SIGNAL * sumOf(totalOf(window)))
    return unreachable({ reason: 'no-signal' });
  switch (condition.kind) {
    case 'events':
      return reached(window, condition.mean / signal, condition.relativeError, 'events');
    case 'upper-limit':
      return byUpperLimit(window, condition);
    case 'significance':
      return bySignificance(window, condition);
  }
}

/** The test of one mean limit against the signal, ln(signal/limit) = 0 in ln X: nearly straight, so the root takes few steps. */
function byUpperLimit(
  window: WindowRates,
  { meanLimit, relativeError }: Extract<GoalCondition, { kind: 'upper-limit' }>,
): NeededExposure {
  const signal = sumOf(window.signalPerKgYr);
  const background = sumOf(totalOf(window));
  const withoutBackground = meanLimit(0) / signal;
  if (background === 0) return reached(window, withoutBackground, relativeError(0), 'upper-limit');
  const lnRatio = (lnX: number): number => lnX - Math.log(meanLimit(Math.exp(lnX) * background) / signal);
  const { root, error } = firstCrossing(lnRatio, Math.log(withoutBackground), ROOT_TOLERANCE);
  const exposure = Math.exp(root);
  // At large background X ∝ limit², at none X ∝ limit.
  return reached(window, exposure, error + 2 * relativeError(exposure * background), 'upper-limit');
}

function bySignificance(
  window: WindowRates,
  { test, significance, minimumEvents }: Extract<GoalCondition, { kind: 'significance' }>,
): NeededExposure {
  const { shared, pooledSignal } = testedBins(test, window);
  const events = minimumEvents / sumOf(window.signalPerKgYr);
  const unbounded = pooledSignal > 0 ? minimumEvents / pooledSignal : Infinity;
  const hasSharedSignal = sumOf(shared.signalPerKgYr) > 0;
  const crossing = hasSharedSignal
    ? significanceCrossing(shared, asimovDeviance(test, shared.signalPerKgYr, binned(shared)), significance)
    : undefined;
  const crossed = crossing?.isReached ? crossing.exposure : Infinity;
  if (unbounded === Infinity && crossing && !crossing.isReached) return unreachable(crossing.cap);
  if (events >= Math.min(crossed, unbounded)) return reached(window, events, Number.EPSILON, 'minimum-events');
  return crossing?.isReached && crossed < unbounded
    ? reached(window, crossed, crossing.error, 'significance')
    : reached(window, unbounded, Number.EPSILON, 'minimum-events');
}

type Crossing =
  | { readonly isReached: true; readonly exposure: number; readonly error: number }
  | { readonly isReached: false; readonly cap: Unreachable };

/** Where √q reaches `significance`, or the cap that systematic uncertainties put on it: q + dq/d ln X, since q = q_∞ − c/X there. */
function significanceCrossing(window: WindowRates, deviance: AsimovByExposure, significance: number): Crossing {
  const eventsPerExposure = sumOf(window.signalPerKgYr) + sumOf(totalOf(window));
  const target = significance ** 2;
  const isCapped = window.backgrounds.some((background) => background.relativeUncertainty > 0);
  const start = Math.log(1 / eventsPerExposure);
  let lnX = start;
  let at = deviance(Math.exp(lnX));
  while (at.q < target) {
    const events = Math.exp(lnX) * eventsPerExposure;
    if (isCapped && events > SATURATION_EVENTS && at.qOfBins < SATURATION_SHARE * at.q) {
      const largestSignificance = Math.sqrt(at.q + at.qOfBins);
      return {
        isReached: false,
        cap: { reason: 'systematic-uncertainty', largestSignificance, requiredSignificance: significance },
      };
    }
    lnX += Math.LN2 * 2;
    at = deviance(Math.exp(lnX));
  }
  const rising = (u: number): number => Math.log(deviance(Math.exp(u)).q / target);
  const { root, error } = firstCrossing(rising, lnX, ROOT_TOLERANCE);
  return { isReached: true, exposure: Math.exp(root), error };
}

type Unreachable = Pick<NeededExposure, 'reason' | 'largestSignificance' | 'requiredSignificance'>;

function unreachable(why: Unreachable): NeededExposure {
  return { neededKgYr: null, expectedSignal: null, expectedBackground: null, relativeError: 0, binding: null, ...why };
}

function reached(
  window: WindowRates,
  exposure: number,
  relativeError: number,
  binding: BindingCondition,
): NeededExposure {
  return {
    neededKgYr: exposure,
    expectedSignal: exposure * sumOf(window.signalPerKgYr),
    expectedBackground: exposure * sumOf(totalOf(window)),
    relativeError,
    binding,
  };
}
