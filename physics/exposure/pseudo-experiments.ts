/**
 * What a goal's exposure achieves in simulated experiments, beside what was expected of it: a check of the asymptotic formulas
 * where counts are few. Deterministic for a seed.
 */
import { DomainError, requirePositive } from '../errors.ts';
import { asimovDeviance, type BinnedBackground, multiplierFit, totalBackground } from './asimov.ts';
import { clsUpperLimit, meanCountingLimit } from './counting.ts';
import {
  binned,
  DEFAULT_MINIMUM_EVENTS,
  type ExclusionMethod,
  type Goal,
  poolBinsWithoutBackground,
  type WindowRates,
} from './needed-exposure.ts';
import { probabilityOfAtLeast } from './poisson.ts';
import { poissonSampler } from './poisson-sampling.ts';
import { type Random, seededRandom } from './random.ts';
import { meanUnifiedLimit, unifiedUpperLimit } from './unified.ts';

export interface PseudoExperimentOptions {
  /** How many, an integer from 100 to 10⁶. */
  readonly experiments: number;
  /** An integer from 0 to 2⁵³ − 1. */
  readonly seed: number;
}

export interface PseudoExperiments {
  /**
   * `fraction`: of experiments with at least the wanted signal events. `mean-upper-limit`: on the signal, events, without signal.
   * `median-significance`: √q, σ, with signal for a discovery, without for an exclusion. A discovery whose √q is unbounded (bins without
   * background) gives the `fraction` with the minimum of events.
   */
  readonly quantity: 'fraction' | 'mean-upper-limit' | 'median-significance';
  readonly achieved: number;
  /** One standard deviation of `achieved`, from the number of experiments; 0 where a median sits on one frequent value. */
  readonly standardError: number;
  /** What the goal's own formula says of the same quantity. */
  readonly expected: number;
  /** Of an upper limit: the fraction of experiments with signal whose limit is not below it. */
  readonly coverage?: number;
}

const FEWEST_EXPERIMENTS = 100;
const MOST_EXPERIMENTS = 1_000_000;
/** Above this background the limits are interpolated on a grid of counts; above the second they are not simulated. */
const INTERPOLATED_ABOVE = 1e4;
const NOT_SIMULATED_ABOVE = 1e6;
/** Of a fit's deviance: far below the spread of experiments. */
const RELATIVE_TOLERANCE = 1e-6;
/** A limit this close below the signal is equal to it: without background the exposure is where they are equal. */
const LIMIT_ROUNDING = 1e-9;

/**
 * Simulates `goal` at an exposure (kg yr, > 0), usually the needed one.
 *
 * Undefined where there is nothing to simulate: a limit at more than 10⁶ background events, where it is Gaussian.
 * @throws DomainError for numbers outside their domain. @example
 * pseudoExperiments(window, { kind: 'exclusion', confidence: 0.9 }, 1.5, { experiments: 20000, seed: 1 })
 */
export function pseudoExperiments(
  window: WindowRates,
  goal: Goal,
  exposureKgYr: number,
  { experiments, seed }: PseudoExperimentOptions,
): PseudoExperiments | undefined {
  requirePositive('exposure', exposureKgYr);
  if (!(Number.isInteger(experiments) && experiments >= FEWEST_EXPERIMENTS && experiments <= MOST_EXPERIMENTS)) {
    throw new DomainError('experiments', experiments, `an integer from ${FEWEST_EXPERIMENTS} to ${MOST_EXPERIMENTS}`);
  }
  const random = seededRandom(seed);
  const signal = window.signalPerKgYr.map((rate) => rate * exposureKgYr);
  const backgrounds = binned(window).map((b) => ({ ...b, perBin: b.perBin.map((rate) => rate * exposureKgYr) }));
  switch (goal.kind) {
    case 'events':
      return fractionWithEvents(sum(signal), goal.count, experiments, random);
    case 'detection':
      return fractionWithEvents(sum(signal), goal.atLeast, experiments, random);
    case 'exclusion': {
      if (goal.method === 'likelihood')
        return medianSignificance('exclusion', signal, backgrounds, experiments, random);
      const background = sum(totalBackground(signal.length, backgrounds));
      return upperLimits(goal.method ?? 'counting', goal.confidence, sum(signal), background, experiments, random);
    }
    case 'discovery': {
      const minimumEvents = goal.minimumEvents ?? DEFAULT_MINIMUM_EVENTS;
      const { shared, pooledSignal } = poolBinsWithoutBackground(window);
      const isUnbounded = pooledSignal * exposureKgYr >= minimumEvents * (1 - LIMIT_ROUNDING);
      if (isUnbounded || sum(shared.signalPerKgYr) === 0)
        return fractionWithEvents(sum(signal), minimumEvents, experiments, random);
      const sharedSignal = shared.signalPerKgYr.map((rate) => rate * exposureKgYr);
      const sharedBackgrounds = binned(shared).map((b) => ({
        ...b,
        perBin: b.perBin.map((rate) => rate * exposureKgYr),
      }));
      return medianSignificance('discovery', sharedSignal, sharedBackgrounds, experiments, random);
    }
  }
}

function fractionWithEvents(signal: number, events: number, experiments: number, random: Random): PseudoExperiments {
  const draw = poissonSampler(signal);
  let met = 0;
  for (let k = 0; k < experiments; k++) if (draw(random) >= events) met++;
  const expected = probabilityOfAtLeast(Math.ceil(events), signal);
  return {
    quantity: 'fraction',
    achieved: met / experiments,
    standardError: Math.sqrt((expected * (1 - expected)) / experiments),
    expected,
  };
}

function upperLimits(
  method: Exclude<ExclusionMethod, 'likelihood'>,
  confidence: number,
  signal: number,
  background: number,
  experiments: number,
  random: Random,
): PseudoExperiments | undefined {
  if (background > NOT_SIMULATED_ABOVE) return undefined;
  const limitOf = limitsByCount(method, confidence, background);
  const drawBackground = poissonSampler(background);
  const drawBoth = poissonSampler(background + signal);
  const expected = (method === 'counting' ? meanCountingLimit(confidence) : meanUnifiedLimit(confidence))(background);
  // Deviations from the expected mean are summed: the variance then survives limits that are all alike.
  let deviation = 0;
  let deviationSquared = 0;
  let covered = 0;
  for (let k = 0; k < experiments; k++) {
    const difference = limitOf(drawBackground(random)) - expected;
    deviation += difference / experiments;
    deviationSquared += difference ** 2 / experiments;
    if (limitOf(drawBoth(random)) >= signal * (1 - LIMIT_ROUNDING)) covered++;
  }
  return {
    quantity: 'mean-upper-limit',
    achieved: expected + deviation,
    standardError: Math.sqrt(Math.max(0, deviationSquared - deviation ** 2) / experiments),
    expected,
    coverage: covered / experiments,
  };
}

/** The limit as a function of the count, each computed once; at large background linear between counts √b/16 apart (2e-4 of the limit). */
function limitsByCount(
  method: 'counting' | 'unified',
  confidence: number,
  background: number,
): (count: number) => number {
  const known = new Map<number, number>();
  const limitOf = (n: number): number => {
    let limit = known.get(n);
    if (limit === undefined) {
      limit =
        method === 'counting' ? clsUpperLimit(n, background, confidence) : unifiedUpperLimit(n, background, confidence);
      known.set(n, limit);
    }
    return limit;
  };
  if (background <= INTERPOLATED_ABOVE) return limitOf;
  const spacing = Math.round(Math.sqrt(background) / 16);
  return (n) => {
    const from = Math.floor(n / spacing) * spacing;
    const share = (n - from) / spacing;
    return (1 - share) * limitOf(from) + share * limitOf(from + spacing);
  };
}

/**
 * Median of √q over experiments. The tested μ (0 for a discovery, 1 for an exclusion) is compared with the best μ ≥ 0; q = 0 where the
 * best μ lies on the wrong side of the tested one (q₀ and q̃ of Cowan et al.). Both fits start from those of the Asimov set.
 */
function medianSignificance(
  test: 'discovery' | 'exclusion',
  signal: readonly number[],
  backgrounds: readonly BinnedBackground[],
  experiments: number,
  random: Random,
): PseudoExperiments {
  const bins = signal.length;
  const tested = test === 'discovery' ? 0 : 1;
  const present = 1 - tested;
  const total = totalBackground(bins, backgrounds);
  const uncertain = backgrounds.filter((background) => background.relativeUncertainty > 0);
  const auxiliary = uncertain.map((background) => 1 / background.relativeUncertainty ** 2);
  const { fit: atTested, scale } = multiplierFit(bins, uncertain, []);
  const { fit: free, scale: scaleFree } = multiplierFit(bins, uncertain, [signal]);
  scale(1);
  scaleFree(1);
  const truth = Float64Array.from([...total.map((b, i) => b + present * signal[i]), ...auxiliary]);
  const meansTested = Float64Array.from([...total.map((b, i) => b + tested * signal[i]), ...auxiliary]);
  const meansFree = Float64Array.from([...total, ...auxiliary]);
  const samplers = Array.from(truth, poissonSampler);

  const setCounts = (count: (row: number) => number): void => {
    for (let i = 0; i < truth.length; i++) {
      const n = count(i);
      atTested.counts[i] = n;
      atTested.offsets[i] = meansTested[i] - n;
      atTested.means[i] = meansTested[i];
      free.counts[i] = n;
      free.offsets[i] = meansFree[i] - n;
      free.means[i] = meansFree[i];
    }
  };
  setCounts((i) => truth[i]);
  atTested.minimise(RELATIVE_TOLERANCE);
  const start = Float64Array.from(atTested.parameters);

  const significances = new Float64Array(experiments);
  for (let k = 0; k < experiments; k++) {
    setCounts((i) => samplers[i](random));
    atTested.parameters.set(start);
    free.parameters.fill(0);
    free.parameters[0] = present;
    const restricted = atTested.minimise(RELATIVE_TOLERANCE);
    const best = free.minimise(RELATIVE_TOLERANCE);
    const isWrongSide = test === 'exclusion' && free.parameters[0] > tested;
    significances[k] = isWrongSide ? 0 : Math.sqrt(Math.max(0, 2 * (restricted - best)));
  }
  significances.sort();
  return {
    quantity: 'median-significance',
    achieved: quantile(significances, 0.5),
    standardError: medianError(significances),
    expected: Math.sqrt(asimovDeviance(test, signal, backgrounds)(1).q),
  };
}

/** Half the distance between the order statistics one standard deviation (√N/2 ranks) either side of the median. */
function medianError(sorted: Float64Array): number {
  const shift = 0.5 / Math.sqrt(sorted.length);
  return (quantile(sorted, 0.5 + shift) - quantile(sorted, 0.5 - shift)) / 2;
}

function quantile(sorted: Float64Array, p: number): number {
  const position = p * (sorted.length - 1);
  const below = Math.floor(position);
  const above = Math.min(below + 1, sorted.length - 1);
  return sorted[below] + (position - below) * (sorted[above] - sorted[below]);
}

function sum(values: readonly number[]): number {
  return values.reduce((total, value) => total + value, 0);
}
