/**
 * The smallest cross section with which a goal holds at a given exposure: the inverse of exposure/needed-exposure, at one mass.
 *
 * Rates are linear in σ̄ₑ, so nothing is computed but a scale λ of the signal: σ̄ₑ = λ × the cross section the rates were computed for.
 * S: signal rate and B: background rate in the window, 1/(kg yr). X: exposure, kg yr.
 *
 *   events, detection                        λ = mean/(S X)
 *   exclusion by counting, unified           λ = meanLimit(B X)/(S X)
 *   exclusion by likelihood, discovery       √q(λ) = significance, and λ S X ≥ the minimum of events
 *
 * q is convex in λ and least, 0, at λ = 0: the deviance n ln(n/ν) − n + ν is convex in (n, ν) together, both are linear in λ and the
 * multipliers θ, and a minimum over θ keeps that. So it rises, at least as a straight line in the end, and every goal is reached by a
 * large enough signal, also where systematic uncertainties cap what exposure alone can do. Only a window without signal is not.
 */
import { DomainError, requirePositive } from '../errors.ts';
import { asimovDeviance, checkBins } from '../exposure/asimov.ts';
import {
  type Background,
  type BindingCondition,
  binned,
  type Goal,
  type GoalCondition,
  goalCondition,
  sumOf,
  testedBins,
  totalOf,
  type WindowRates,
} from '../exposure/goal.ts';
import { firstCrossing } from '../numeric/first-crossing.ts';

export interface ReachSearch {
  readonly goal: Goal;
  /** X, kg yr, > 0. */
  readonly exposureKgYr: number;
  /** 1/(kg yr) per bin of the window; the same at every mass. */
  readonly backgrounds: readonly Background[];
}

/** The signal in the window at one mass. */
export interface ReferenceSignal {
  /** The σ̄ₑ, cm², > 0, of these rates; any. */
  readonly crossSectionCm2: number;
  /** 1/(kg yr), one for each bin of the window. */
  readonly ratesPerKgYr: readonly number[];
  /** Relative errors of those rates, ≥ 0; default none. */
  readonly relativeErrors?: readonly number[];
}

export interface ReachPoint {
  /** σ̄ₑ, cm², above 0; null where no cross section reaches the goal: see `reason`. */
  readonly crossSectionCm2: number | null;
  /** Error of the cross section, relative: of the inversion, and what the rates' errors, all of one sign, do to it. */
  readonly relativeError: number;
  /** Events in the window with that cross section; null without one. The background is the same with any. */
  readonly expectedSignal: number | null;
  readonly expectedBackground: number;
  readonly binding: BindingCondition | null;
  /** No particle of the halo feeds the window. */
  readonly reason?: 'no-signal';
}

/** Half-width of the root in ln λ. */
const ROOT_TOLERANCE = 1e-11;
/** A cross section, cm², beyond which there is none, and events beyond which there is no exposure: ends that leave room in a double. */
const LARGEST = 1e100;

/** λ of a signal, its error from the inversion, and the condition that sets it. */
interface Scale {
  readonly scale: number;
  readonly relativeError: number;
  readonly binding: BindingCondition;
}
type ScaleOf = (signalPerKgYr: readonly number[]) => Scale;

/**
 * Checks a search once; what it returns gives the reach for one mass after the other, and computes the mean upper limit, which
 * does not depend on the mass, at most once.
 *
 * Accuracy: 1e-8 or better against neededExposure for every goal (test/physics/reach/reach-point.test.ts); backgrounds uncertain by up to a
 * factor 10⁶.
 *
 * @throws DomainError for numbers outside their domain, for uncertain backgrounds with `counting` and `unified`, and for more than
 * 1e100 events.
 * @example
 * const reach = reachPoints({ goal: { kind: 'events', count: 3 }, exposureKgYr: 2, backgrounds: [] });
 * reach({ crossSectionCm2: 1e-37, ratesPerKgYr: [15] }).crossSectionCm2 // 1e-38
 */
export function reachPoints({ goal, exposureKgYr, backgrounds }: ReachSearch): (signal: ReferenceSignal) => ReachPoint {
  requirePositive('exposure', exposureKgYr);
  const scaleOf = scaleFor(goalCondition(goal, backgrounds), exposureKgYr, backgrounds);
  return ({ crossSectionCm2, ratesPerKgYr, relativeErrors = [] }) => {
    requirePositive('crossSection', crossSectionCm2);
    const window: WindowRates = { signalPerKgYr: ratesPerKgYr, backgrounds };
    checkBins(ratesPerKgYr, binned(window));
    const signal = exposureKgYr * sumOf(ratesPerKgYr);
    const expectedBackground = exposureKgYr * sumOf(totalOf(window));
    if (!(signal < LARGEST && expectedBackground < LARGEST))
      throw new DomainError('exposure', exposureKgYr, `so small that fewer than ${LARGEST} events are expected`);
    if (!(crossSectionCm2 / signal < LARGEST)) return withoutReach(expectedBackground);
    const { scale, relativeError, binding } = scaleOf(ratesPerKgYr);
    return {
      crossSectionCm2: scale * crossSectionCm2,
      relativeError: relativeError + errorFromRates(scaleOf, ratesPerKgYr, relativeErrors, scale),
      expectedSignal: scale * signal,
      expectedBackground,
      binding,
    };
  };
}

function withoutReach(expectedBackground: number): ReachPoint {
  return {
    crossSectionCm2: null,
    relativeError: 0,
    expectedSignal: null,
    expectedBackground,
    binding: null,
    reason: 'no-signal',
  };
}

/** How far the scale moves, relative, when every rate is larger by its error. */
function errorFromRates(
  scaleOf: ScaleOf,
  rates: readonly number[],
  relativeErrors: readonly number[],
  scale: number,
): number {
  if (relativeErrors.every((error) => error === 0)) return 0;
  const shifted = rates.map((rate, i) => rate * (1 + (relativeErrors[i] ?? 0)));
  return Math.abs(Math.log(scale / scaleOf(shifted).scale));
}

function scaleFor(condition: GoalCondition, exposureKgYr: number, backgrounds: readonly Background[]): ScaleOf {
  switch (condition.kind) {
    case 'events':
      return (rates) => ({
        scale: condition.mean / (exposureKgYr * sumOf(rates)),
        relativeError: condition.relativeError,
        binding: 'events',
      });
    case 'upper-limit':
      return scaleByUpperLimit(condition, exposureKgYr, backgrounds);
    case 'significance':
      return (rates) => scaleBySignificance(condition, exposureKgYr, { signalPerKgYr: rates, backgrounds });
  }
}

/** The limit can take a tenth of a second, so it is computed when first wanted, and kept. */
function scaleByUpperLimit(
  { meanLimit, relativeError }: Extract<GoalCondition, { kind: 'upper-limit' }>,
  exposureKgYr: number,
  backgrounds: readonly Background[],
): ScaleOf {
  const background = exposureKgYr * sumOf(backgrounds.map(({ ratesPerKgYr }) => sumOf(ratesPerKgYr)));
  let limit: number | undefined;
  return (rates) => {
    limit ??= meanLimit(background);
    return {
      scale: limit / (exposureKgYr * sumOf(rates)),
      relativeError: relativeError(background),
      binding: 'upper-limit',
    };
  };
}

/** The pool of bins without background makes √q unbounded, and so does a jump: the scale is the smallest that is past it. */
function scaleBySignificance(
  { test, significance, minimumEvents }: Extract<GoalCondition, { kind: 'significance' }>,
  exposureKgYr: number,
  window: WindowRates,
): Scale {
  const { shared, pooledSignal } = testedBins(test, window);
  const events = minimumEvents / (exposureKgYr * sumOf(window.signalPerKgYr));
  const unbounded = pooledSignal > 0 ? minimumEvents / (exposureKgYr * pooledSignal) : Infinity;
  const hasSharedSignal = sumOf(shared.signalPerKgYr) > 0;
  const crossing = hasSharedSignal
    ? significanceCrossing(deviancesOf(test, exposureKgYr, shared), significance, events)
    : { scale: Infinity, relativeError: 0 };
  if (events >= Math.min(crossing.scale, unbounded))
    return { scale: events, relativeError: Number.EPSILON, binding: 'minimum-events' };
  return crossing.scale < unbounded
    ? { ...crossing, binding: 'significance' }
    : { scale: unbounded, relativeError: Number.EPSILON, binding: 'minimum-events' };
}

/** q at the exposure as a function of λ. */
function deviancesOf(
  test: 'discovery' | 'exclusion',
  exposureKgYr: number,
  window: WindowRates,
): (scale: number) => number {
  const backgrounds = binned(window);
  return (scale) => {
    const signal = window.signalPerKgYr.map((rate) => scale * rate);
    return asimovDeviance(test, signal, backgrounds)(exposureKgYr).q;
  };
}

function significanceCrossing(
  q: (scale: number) => number,
  significance: number,
  start: number,
): { scale: number; relativeError: number } {
  const rising = (lnScale: number): number => Math.log(q(Math.exp(lnScale)) / significance ** 2);
  const { root, error } = firstCrossing(rising, Math.log(start), ROOT_TOLERANCE);
  return { scale: Math.exp(root), relativeError: error };
}
