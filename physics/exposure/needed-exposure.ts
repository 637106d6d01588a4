/**
 * The smallest exposure from which a goal holds, from the rates per bin of the window.
 *
 * S: signal rate and B: background rate in the window, 1/(kg yr). X: exposure, kg yr. Every condition that is solved for rises with X,
 * so the first crossing is the only one.
 */
import { DomainError, requirePositive } from '../errors.ts';
import { bracketedRoot } from '../numeric/bracketed-root.ts';
import { type AsimovByExposure, asimovDeviance, checkBins, totalBackground } from './asimov.ts';
import { meanCountingLimit } from './counting.ts';
import { normalAbove } from './normal.ts';
import { meanForAtLeast } from './poisson.ts';
import { requireProbability } from './probability.ts';
import { meanUnifiedLimit } from './unified.ts';

export interface Background {
  readonly name: string;
  /** 1/(kg yr), one a bin, after all detector effects. */
  readonly ratesPerKgYr: readonly number[];
  /** r ≥ 0; 0 is a background known exactly. */
  readonly relativeUncertainty: number;
}

export interface WindowRates {
  /** 1/(kg yr), one for each bin of the window. */
  readonly signalPerKgYr: readonly number[];
  readonly backgrounds: readonly Background[];
}

export type ExclusionMethod = 'counting' | 'unified' | 'likelihood';

export type Goal =
  | { readonly kind: 'events'; readonly count: number }
  | { readonly kind: 'detection'; readonly atLeast: number; readonly probability: number }
  | { readonly kind: 'exclusion'; readonly confidence: number; readonly method?: ExclusionMethod }
  | { readonly kind: 'discovery'; readonly significance: number; readonly minimumEvents?: number };

/** Events a discovery needs at least, unless the goal says otherwise. */
export const DEFAULT_MINIMUM_EVENTS = 3;

/** Which condition sets the exposure. */
export type BindingCondition = 'events' | 'upper-limit' | 'significance' | 'minimum-events';

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
/** Errors of the mean limits, relative (their own doc comments). */
const COUNTING_ERROR = 1e-9;
const UNIFIED_ERROR = { summed: 1e-9, largeBackground: 7e-4, summedUpTo: 1000 };
/** A signal rate, 1/(kg yr) or relative to the background's, whose exposure would leave a double's range: none. */
const NEGLIGIBLE_SIGNAL = 1e-100;
/** A significance that has all but stopped rising with this many events expected is taken to stop for good. */
const SATURATION_EVENTS = 1e14;
/** … where its square would still rise by less than this share if the exposure were multiplied by e. */
const SATURATION_SHARE = 1e-3;

/**
 * The smallest exposure from which `goal` holds.
 *
 * `events`, `detection` and every minimum count the signal in the window.
 * `exclusion`: `counting` and `unified`, the mean upper limit of the summed window is at most the signal; `likelihood`, median CLs on
 * the Asimov set: √q ≥ Φ⁻¹(1 − (1 − confidence)/2) and at least −ln(1 − confidence) signal events.
 * `discovery`: Asimov, one-sided, and at least `minimumEvents`. Bins without background are pooled: left out of √q while their
 * expected signal is below `minimumEvents`; from there on √q is unbounded, a jump, and the exposure of that jump is then
 * the answer if the other bins have not reached the goal before.
 *
 * @throws DomainError for numbers outside their domain, and for uncertain backgrounds with `counting` and `unified`.
 * @example
 * neededExposure({ signalPerKgYr: [2], backgrounds: [] }, { kind: 'exclusion', confidence: 0.9 }).neededKgYr // 1.1513
 */
export function neededExposure(window: WindowRates, goal: Goal): NeededExposure {
  checkBins(window.signalPerKgYr, binned(window));
  const signal = sum(window.signalPerKgYr);
  const solve = conditionOf(window, goal, signal);
  const background = sum(totalOf(window));
  if (signal < NEGLIGIBLE_SIGNAL || signal < NEGLIGIBLE_SIGNAL * background)
    return unreachable({ reason: 'no-signal' });
  return solve();
}

/** Checks the goal, and returns how to solve for it when there is a signal. */
function conditionOf(window: WindowRates, goal: Goal, signal: number): () => NeededExposure {
  switch (goal.kind) {
    case 'events':
      requirePositive('count', goal.count);
      return () => reached(window, goal.count / signal, Number.EPSILON, 'events');
    case 'detection': {
      const mean = meanForAtLeast(goal.atLeast, goal.probability);
      return () => reached(window, mean / signal, 1e-13, 'events');
    }
    case 'exclusion': {
      requireProbability('confidence', goal.confidence);
      if (goal.method === 'likelihood') return () => likelihoodExclusion(window, goal.confidence);
      const method = goal.method ?? 'counting';
      requireKnownBackgrounds(window, method);
      const meanLimit = method === 'counting' ? meanCountingLimit(goal.confidence) : meanUnifiedLimit(goal.confidence);
      return () => limitExclusion(window, meanLimit, method);
    }
    case 'discovery': {
      const minimumEvents = goal.minimumEvents ?? DEFAULT_MINIMUM_EVENTS;
      requirePositive('significance', goal.significance);
      requirePositive('minimumEvents', minimumEvents);
      return () => discovery(window, goal.significance, minimumEvents);
    }
  }
}

/** The test of one mean limit against the signal, ln(limit/signal) = 0 in ln X: nearly straight, so the root takes few steps. */
function limitExclusion(
  window: WindowRates,
  meanLimit: (background: number) => number,
  method: 'counting' | 'unified',
): NeededExposure {
  const signal = sum(window.signalPerKgYr);
  const background = sum(totalOf(window));
  const withoutBackground = meanLimit(0) / signal;
  if (background === 0) return reached(window, withoutBackground, COUNTING_ERROR, 'upper-limit');
  const lnRatio = (lnX: number): number => Math.log(meanLimit(Math.exp(lnX) * background) / signal) - lnX;
  const from = Math.log(withoutBackground);
  const { root, error } = firstCrossing((lnX) => -lnRatio(lnX), from);
  const exposure = Math.exp(root);
  return reached(window, exposure, error + limitError(method, exposure * background), 'upper-limit');
}

/** Error of the exposure from that of the limit: at large background X ∝ limit², at none X ∝ limit. */
function limitError(method: 'counting' | 'unified', background: number): number {
  if (method === 'counting') return 2 * COUNTING_ERROR;
  const { summed, largeBackground, summedUpTo } = UNIFIED_ERROR;
  return 2 * (background <= summedUpTo ? summed : largeBackground * Math.sqrt(summedUpTo / background));
}

function likelihoodExclusion(window: WindowRates, confidence: number): NeededExposure {
  const signal = sum(window.signalPerKgYr);
  const significance = normalAbove((1 - confidence) / 2);
  const events = -Math.log1p(-confidence) / signal;
  const crossing = significanceCrossing(
    window,
    asimovDeviance('exclusion', window.signalPerKgYr, binned(window)),
    significance,
  );
  if (!crossing.isReached) return unreachable(crossing.cap);
  return events >= crossing.exposure
    ? reached(window, events, Number.EPSILON, 'minimum-events')
    : reached(window, crossing.exposure, crossing.error, 'significance');
}

function discovery(window: WindowRates, significance: number, minimumEvents: number): NeededExposure {
  const { shared, pooledSignal } = poolBinsWithoutBackground(window);
  const events = minimumEvents / sum(window.signalPerKgYr);
  const unbounded = pooledSignal > 0 ? minimumEvents / pooledSignal : Infinity;
  const hasSharedSignal = sum(shared.signalPerKgYr) > 0;
  const crossing = hasSharedSignal
    ? significanceCrossing(shared, asimovDeviance('discovery', shared.signalPerKgYr, binned(shared)), significance)
    : undefined;
  const bySignificance = crossing?.isReached ? crossing.exposure : Infinity;
  if (unbounded === Infinity && crossing && !crossing.isReached) return unreachable(crossing.cap);
  if (events >= Math.min(bySignificance, unbounded)) return reached(window, events, Number.EPSILON, 'minimum-events');
  return crossing?.isReached && bySignificance < unbounded
    ? reached(window, bySignificance, crossing.error, 'significance')
    : reached(window, unbounded, Number.EPSILON, 'minimum-events');
}

/** The bins that have background, and the signal rate, 1/(kg yr), of those that have none. */
export function poolBinsWithoutBackground(window: WindowRates): { shared: WindowRates; pooledSignal: number } {
  const total = totalOf(window);
  const inShared = (rates: readonly number[]): number[] => rates.filter((_, i) => total[i] > 0);
  return {
    shared: {
      signalPerKgYr: inShared(window.signalPerKgYr),
      backgrounds: window.backgrounds.map((background) => ({
        ...background,
        ratesPerKgYr: inShared(background.ratesPerKgYr),
      })),
    },
    pooledSignal: sum(window.signalPerKgYr.filter((_, i) => total[i] === 0)),
  };
}

type Crossing =
  | { readonly isReached: true; readonly exposure: number; readonly error: number }
  | { readonly isReached: false; readonly cap: Unreachable };

/** Where √q reaches `significance`, or the cap that systematic uncertainties put on it: q + dq/d ln X, since q = q_∞ − c/X there. */
function significanceCrossing(window: WindowRates, deviance: AsimovByExposure, significance: number): Crossing {
  const eventsPerExposure = sum(window.signalPerKgYr) + sum(totalOf(window));
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
  const { root, error } = firstCrossing((u) => Math.log(deviance(Math.exp(u)).q / target), lnX);
  return { isReached: true, exposure: Math.exp(root), error };
}

/** The root of a function of ln X that rises through 0, bracketed by steps of doubled length from `start`. */
function firstCrossing(rising: (lnX: number) => number, start: number): { root: number; error: number } {
  let step = Math.LN2;
  let low = start;
  let high = start;
  if (rising(start) < 0) {
    do {
      low = high;
      high += step;
      step *= 2;
    } while (rising(high) < 0);
  } else {
    do {
      high = low;
      low -= step;
      step *= 2;
    } while (rising(low) > 0);
  }
  return bracketedRoot(rising, low, high, ROOT_TOLERANCE);
}

function requireKnownBackgrounds(window: WindowRates, method: ExclusionMethod): void {
  window.backgrounds.forEach(({ relativeUncertainty }, j) => {
    if (relativeUncertainty > 0) {
      const allowed = `0 with the method "${method}"; the method "likelihood" takes uncertain backgrounds`;
      throw new DomainError(['backgrounds', j, 'relativeUncertainty'], relativeUncertainty, allowed);
    }
  });
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
    expectedSignal: exposure * sum(window.signalPerKgYr),
    expectedBackground: exposure * sum(totalOf(window)),
    relativeError,
    binding,
  };
}

/** The window's backgrounds as the likelihood takes them. */
export function binned(
  window: WindowRates,
): { name: string; perBin: readonly number[]; relativeUncertainty: number }[] {
  return window.backgrounds.map(({ name, ratesPerKgYr, relativeUncertainty }) => ({
    name,
    perBin: ratesPerKgYr,
    relativeUncertainty,
  }));
}

function totalOf(window: WindowRates): number[] {
  return totalBackground(window.signalPerKgYr.length, binned(window));
}

function sum(values: readonly number[]): number {
  return values.reduce((total, value) => total + value, 0);
}
