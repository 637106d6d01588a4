/** The answer of POST /v1/trade-offs but for its provenance: one rate, many exposures. Runs in a worker thread. */
import type { GoalIn } from '../schemas/goal.ts';
import type { TradeOffsAnswer } from '../schemas/trade-offs.ts';
import { ionizationModelOf, measuredBackgrounds, measuredSignal, readoutOf } from './detector-view.ts';
import { sumOf } from './estimates.ts';
import { exposureOut, exposureWithError, unreachableSentence, windowOf, windowRates } from './exposure-answer.ts';
import { rateNotices } from './notices.ts';
import { type RatesJob, rateOf } from './rates-answer.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';

export interface TradeOffsJob extends RatesJob {
  readonly goal: GoalIn;
  readonly windowFrom: readonly number[] | undefined;
  readonly readoutIntervalsDays: readonly number[] | undefined;
}

export function tradeOffsAnswer(job: TradeOffsJob): Omit<TradeOffsAnswer, 'provenance'> {
  const { scenario, goal, windowFrom, readoutIntervalsDays } = job;
  const response = readoutOf(scenario);
  const rate = rateOf(job, response.lastElectron);
  const signal = measuredSignal(rate, response);
  const model = ionizationModelOf(scenario.ionization);
  const window = windowOf(goal, scenario.ionization.maxElectrons);
  const notices = rateNotices(scenario, rate);

  const byInterval = (readoutIntervalsDays ?? [undefined]).map((days) => ({
    days,
    backgrounds: measuredBackgrounds(days === undefined ? scenario : withInterval(scenario, days), model, response),
  }));
  const unreachable = new Set<string>();
  const choices = (windowFrom ?? [window.from]).flatMap((from) =>
    byInterval.map(({ days, backgrounds }) => {
      const rates = windowRates(signal, backgrounds, { from, to: window.to });
      const needed = exposureWithError(rates, goal, sumOf(signal.slice(from, window.to + 1)));
      if (needed.neededKgYr === null) unreachable.add(unreachableSentence(needed));
      return {
        windowFrom: from,
        ...(days === undefined ? {} : { readoutInterval: { value: days, unit: 'day' as const } }),
        exposure: exposureOut(needed, rates),
      };
    }),
  );
  for (const detail of unreachable) notices.push({ code: 'goal-unreachable', detail: `For some choices: ${detail}` });
  const reached = choices.filter(({ exposure }) => exposure.needed !== null);
  const cheapest = reached.reduce<(typeof choices)[number] | null>(
    (best, choice) => (best === null || choice.exposure.needed!.value < best.exposure.needed!.value ? choice : best),
    null,
  );
  return { choices, cheapest, notices };
}

/** The scenario with every dark current read at another interval. */
function withInterval(scenario: ResolvedScenario, readoutIntervalDays: number): ResolvedScenario {
  const backgrounds = scenario.backgrounds.map((background) =>
    background.kind === 'darkCurrent' ? { ...background, readoutIntervalDays } : background,
  );
  return { ...scenario, backgrounds };
}
