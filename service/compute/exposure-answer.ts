/** The exposure a goal needs, from what is measured in its window. */
import { dayReached } from '../../physics/exposure/calendar.ts';
import {
  type Background,
  type NeededExposure,
  neededExposure,
  type WindowRates,
} from '../../physics/exposure/needed-exposure.ts';
import { pseudoExperiments } from '../../physics/exposure/pseudo-experiments.ts';
import type { Estimate } from '../../physics/rate/crystal-rate.ts';
import type { PayloadStage } from '../schemas/detector.ts';
import type { GoalIn } from '../schemas/goal.ts';
import type { RatesAnswer } from '../schemas/rates.ts';
import { rateOut, sumOf } from './estimates.ts';
import type { NoticeOut } from './notices.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';

type ExposureOut = NonNullable<RatesAnswer['exposure']>;

/** Beyond this share of difference the asymptotic formula is worth a notice. */
const NOTABLE_DIFFERENCE = 0.05;

/** Measured bins `from`…`to` of signal and backgrounds; index 0 of the input is the bin of no electrons. */
export function windowRates(
  signal: readonly Estimate[],
  backgrounds: readonly Background[],
  window: { readonly from: number; readonly to: number },
): WindowRates {
  const inWindow = <T>(perBin: readonly T[]): T[] => perBin.slice(window.from, window.to + 1);
  return {
    signalPerKgYr: inWindow(signal).map((rate) => rate.value),
    backgrounds: backgrounds.map((background) => ({ ...background, ratesPerKgYr: inWindow(background.ratesPerKgYr) })),
  };
}

/** The window a goal counts in: bins that the readout measures, from 1 up. */
export function windowOf(goal: GoalIn, maxElectrons: number): { from: number; to: number } {
  return { from: goal.window?.from ?? 1, to: goal.window?.to ?? maxElectrons };
}

export interface ExposureWithError extends NeededExposure {
  /** Rate of the signal in the window, 1/(kg yr). */
  readonly signal: Estimate;
}

/**
 * The needed exposure, its error that of the root and what the error of the signal rate does to it: how much more exposure a
 * signal smaller by its error would need.
 */
export function exposureWithError(window: WindowRates, goal: GoalIn, signal: Estimate): ExposureWithError {
  const needed = neededExposure(window, goal);
  if (needed.neededKgYr === null || signal.relativeError === 0) return { ...needed, signal };
  const hasBackground = window.backgrounds.some(({ ratesPerKgYr }) => ratesPerKgYr.some((rate) => rate > 0));
  let fromSignal = signal.relativeError;
  if (hasBackground) {
    const weaker = window.signalPerKgYr.map((rate) => rate * (1 - signal.relativeError));
    const more = neededExposure({ ...window, signalPerKgYr: weaker }, goal).neededKgYr;
    fromSignal = more === null ? 1 : Math.max(signal.relativeError, more / needed.neededKgYr - 1);
  }
  return { ...needed, signal, relativeError: needed.relativeError + fromSignal };
}

export function exposureAnswer(
  scenario: ResolvedScenario,
  goal: GoalIn,
  signal: readonly Estimate[],
  backgrounds: readonly Background[],
  notices: NoticeOut[],
): ExposureOut {
  const counted = windowOf(goal, scenario.ionization.maxElectrons);
  const window = windowRates(signal, backgrounds, counted);
  const needed = exposureWithError(window, goal, sumOf(signal.slice(counted.from, counted.to + 1)));
  if (needed.neededKgYr === null || !(needed.neededKgYr < Infinity)) {
    notices.push({ code: 'goal-unreachable', detail: unreachableSentence(needed) });
  }
  return {
    ...exposureOut(needed, window),
    ...(goal.check && needed.neededKgYr !== null ? checkOut(window, goal, needed.neededKgYr, notices) : {}),
    ...(scenario.payload ? { calendar: calendarOut(scenario.payload, needed.neededKgYr) } : {}),
  };
}

export function exposureOut(needed: ExposureWithError, window: WindowRates): ExposureOut {
  const reached = needed.neededKgYr !== null && needed.neededKgYr < Infinity;
  const background = window.backgrounds.reduce(
    (sum, { ratesPerKgYr }) => sum + ratesPerKgYr.reduce((a, b) => a + b, 0),
    0,
  );
  return {
    needed: reached ? { value: needed.neededKgYr!, unit: 'kg yr', relativeError: needed.relativeError } : null,
    signalRate: rateOut(needed.signal),
    backgroundRate: { value: background, unit: '1/(kg yr)' },
    expectedSignal: reached ? needed.expectedSignal : null,
    expectedBackground: reached ? needed.expectedBackground : null,
    binding: reached ? needed.binding : null,
    ...(needed.largestSignificance === undefined ? {} : { largestSignificance: needed.largestSignificance }),
    ...(needed.requiredSignificance === undefined ? {} : { requiredSignificance: needed.requiredSignificance }),
  };
}

export function unreachableSentence(needed: NeededExposure): string {
  if (needed.reason === 'systematic-uncertainty') {
    const [most, asked] = [needed.largestSignificance, needed.requiredSignificance].map((z) =>
      Number(z?.toPrecision(4)),
    );
    return (
      `No exposure reaches the goal: the uncertainty of the backgrounds keeps the significance below ${most} σ however long the ` +
      `exposure, and ${asked} σ are asked for.`
    );
  }
  return 'No exposure reaches the goal: there is no signal in the window, or too little for any exposure.';
}

function checkOut(
  window: WindowRates,
  goal: GoalIn,
  exposureKgYr: number,
  notices: NoticeOut[],
): Pick<ExposureOut, 'check'> {
  const result = pseudoExperiments(window, goal, exposureKgYr, goal.check!);
  if (!result) {
    notices.push({
      code: 'check-not-simulated',
      detail: 'More than a million background events are expected: the formula is exact enough, nothing was simulated.',
    });
    return {};
  }
  if (Math.abs(result.achieved / result.expected - 1) > NOTABLE_DIFFERENCE) {
    const percent = Math.round(100 * (result.achieved / result.expected - 1));
    notices.push({
      code: 'asymptotic-formula-off',
      detail:
        `Simulated experiments achieve ${Number(result.achieved.toPrecision(4))} where the formula says ${Number(result.expected.toPrecision(4))} ` +
        `(${percent > 0 ? '+' : ''}${percent} %): at so few events the needed exposure is that uncertain.`,
    });
  }
  const { quantity, achieved, standardError, expected, coverage } = result;
  return {
    check: {
      ...goal.check!,
      quantity,
      achieved,
      standardError,
      expected,
      ...(coverage === undefined ? {} : { coverage }),
    },
  };
}

const MS_PER_DAY = 86_400_000;
/** The last day that a date can name. */
const LAST_DAY = 8.64e15 / MS_PER_DAY;

function calendarOut(stages: readonly PayloadStage[], neededKgYr: number | null): ExposureOut['calendar'] {
  const startDays = stages.map(({ startMs }) => (startMs ?? 0) / MS_PER_DAY);
  const dated = stages[0].startMs !== undefined;
  const day =
    neededKgYr === null
      ? Infinity
      : dayReached(
          stages.map((stage, i) => ({ ...stage, startDay: startDays[i] })),
          neededKgYr,
        );
  if (!Number.isFinite(day)) return { duration: null, reached: null };
  const date = dated && day < LAST_DAY ? new Date(Math.ceil(day * MS_PER_DAY)).toISOString().slice(0, 10) : null;
  return { duration: { value: day - startDays[0], unit: 'day' }, reached: date };
}
