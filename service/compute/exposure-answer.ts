/** The exposure a goal needs, from the rates in its window. */
import { meanForAtLeast, upperLimit } from '../../physics/exposure/poisson.ts';
import type { CrystalRate } from '../../physics/rate/crystal-rate.ts';
import type { RatesAnswer } from '../schemas/rates.ts';
import type { GoalIn } from '../schemas/scenario.ts';
import type { NoticeOut } from './notices.ts';

/** Signal events that the goal asks to be expected. */
function eventsNeeded(goal: GoalIn): number {
  switch (goal.kind) {
    case 'events':
      return goal.count;
    case 'detection':
      return meanForAtLeast(goal.atLeast, goal.probability);
    case 'exclusion':
      return upperLimit(0, goal.confidence);
  }
}

export function exposureAnswer(
  goal: GoalIn,
  rate: CrystalRate,
  notices: NoticeOut[],
): NonNullable<RatesAnswer['exposure']> {
  const from = goal.window?.from ?? 1;
  const to = goal.window?.to ?? rate.bins.length;
  const counted = rate.bins.filter(({ electrons }) => electrons >= from && electrons <= to).map((bin) => bin.rate);
  const signal = counted.reduce((sum, r) => sum + r.value, 0);
  const relativeError = signal > 0 ? counted.reduce((sum, r) => sum + r.value * r.relativeError, 0) / signal : 0;
  const events = eventsNeeded(goal);
  const needed = events / signal;
  const signalRate = { value: signal, unit: '1/(kg yr)' as const, relativeError };
  if (!(needed < Infinity)) {
    const why =
      signal > 0
        ? 'the rate in the window is too small for any exposure'
        : 'no particle of this halo feeds the window: the signal rate there is 0';
    notices.push({ code: 'goal-unreachable', detail: `No exposure reaches the goal: ${why}.` });
    return { needed: null, signalRate, expectedSignal: null, expectedBackground: null };
  }
  return {
    needed: { value: needed, unit: 'kg yr', relativeError },
    signalRate,
    expectedSignal: events,
    expectedBackground: 0,
  };
}
