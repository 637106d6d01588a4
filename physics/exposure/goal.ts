/**
 * What a search is to achieve, and the condition on its window that says it has. The exposure that a cross section needs
 * (needed-exposure) and the cross section that an exposure reaches (reach/reach-point) solve the same conditions.
 */
import { DomainError, requirePositive } from '../errors.ts';
import { type AsimovTest, totalBackground } from './asimov.ts';
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

/** Which condition sets the exposure or the cross section. */
export type BindingCondition = 'events' | 'upper-limit' | 'significance' | 'minimum-events';

/** S: signal, B: background, events in the window. */
export type GoalCondition =
  | {
      /** S ≥ mean. */
      readonly kind: 'events';
      readonly mean: number;
      readonly relativeError: number;
    }
  | {
      /** S ≥ meanLimit(B). */
      readonly kind: 'upper-limit';
      readonly meanLimit: (background: number) => number;
      /** Of the limit at a background. */
      readonly relativeError: (background: number) => number;
    }
  | {
      /** √q ≥ significance and S ≥ minimumEvents. */
      readonly kind: 'significance';
      readonly test: AsimovTest;
      readonly significance: number;
      readonly minimumEvents: number;
    };

/** Errors of the mean limits, relative (their own doc comments). */
const COUNTING_ERROR = 1e-9;
const UNIFIED_ERROR = { summed: 1e-9, largeBackground: 7e-4, summedUpTo: 1000 };

/**
 * The condition of a goal.
 *
 * `events`, `detection` and every minimum count the signal in the window.
 * `exclusion`: `counting` and `unified`, the mean upper limit of the summed window is at most the signal; `likelihood`, median CLs on
 * the Asimov set: √q ≥ Φ⁻¹(1 − (1 − confidence)/2) and at least −ln(1 − confidence) signal events.
 * `discovery`: Asimov, one-sided, and at least `minimumEvents`.
 *
 * @throws DomainError for numbers outside their domain, and for uncertain backgrounds with `counting` and `unified`.
 */
export function goalCondition(goal: Goal, backgrounds: readonly Background[]): GoalCondition {
  switch (goal.kind) {
    case 'events':
      requirePositive('count', goal.count);
      return { kind: 'events', mean: goal.count, relativeError: Number.EPSILON };
    case 'detection':
      return { kind: 'events', mean: meanForAtLeast(goal.atLeast, goal.probability), relativeError: 1e-13 };
    case 'exclusion':
      requireProbability('confidence', goal.confidence);
      return goal.method === 'likelihood'
        ? likelihoodExclusion(goal.confidence)
        : limitExclusion(goal.confidence, goal.method ?? 'counting', backgrounds);
    case 'discovery': {
      const { significance, minimumEvents = DEFAULT_MINIMUM_EVENTS } = goal;
      requirePositive('significance', significance);
      requirePositive('minimumEvents', minimumEvents);
      return { kind: 'significance', test: 'discovery', significance, minimumEvents };
    }
  }
}

function likelihoodExclusion(confidence: number): GoalCondition {
  return {
    kind: 'significance',
    test: 'exclusion',
    significance: normalAbove((1 - confidence) / 2),
    minimumEvents: -Math.log1p(-confidence),
  };
}

function limitExclusion(
  confidence: number,
  method: 'counting' | 'unified',
  backgrounds: readonly Background[],
): GoalCondition {
  requireKnownBackgrounds(backgrounds, method);
  return method === 'counting'
    ? { kind: 'upper-limit', meanLimit: meanCountingLimit(confidence), relativeError: () => COUNTING_ERROR }
    : { kind: 'upper-limit', meanLimit: meanUnifiedLimit(confidence), relativeError: unifiedError };
}

function unifiedError(background: number): number {
  const { summed, largeBackground, summedUpTo } = UNIFIED_ERROR;
  return background <= summedUpTo ? summed : largeBackground * Math.sqrt(summedUpTo / background);
}

function requireKnownBackgrounds(backgrounds: readonly Background[], method: ExclusionMethod): void {
  backgrounds.forEach(({ relativeUncertainty }, j) => {
    if (relativeUncertainty > 0) {
      const allowed = `0 with the method "${method}"; the method "likelihood" takes uncertain backgrounds`;
      throw new DomainError(['backgrounds', j, 'relativeUncertainty'], relativeUncertainty, allowed);
    }
  });
}

/** What a test of significance is made of. */
export interface TestedBins {
  /** The bins √q is computed from. */
  readonly shared: WindowRates;
  /** Signal rate, 1/(kg yr), of the bins that make √q unbounded once it has the minimum of events. */
  readonly pooledSignal: number;
}

/**
 * The bins of a test. For a discovery, bins without background are pooled: left out of √q while their expected signal is below
 * `minimumEvents`; from there on √q is unbounded, a jump. An exclusion uses every bin.
 */
export function testedBins(test: AsimovTest, window: WindowRates): TestedBins {
  return test === 'exclusion' ? { shared: window, pooledSignal: 0 } : poolBinsWithoutBackground(window);
}

/** The bins that have background, and the signal rate, 1/(kg yr), of those that have none. */
export function poolBinsWithoutBackground(window: WindowRates): TestedBins {
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
    pooledSignal: sumOf(window.signalPerKgYr.filter((_, i) => total[i] === 0)),
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

/** Summed background of each bin, 1/(kg yr). */
export function totalOf(window: WindowRates): number[] {
  return totalBackground(window.signalPerKgYr.length, binned(window));
}

export function sumOf(values: readonly number[]): number {
  return values.reduce((total, value) => total + value, 0);
}
