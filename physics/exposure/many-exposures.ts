/**
 * The exposures that many windows need for one goal, as drawn from uncertain parameters. Goals that ask for a mean upper
 * limit s(b) are slow to invert one by one: the exposure X with S X = s(B X) depends on S/B alone,
 *
 *   S/B = s(b)/b,   X = b/B,      S, B signal and background rate in the window, 1/(kg yr); b = B X, events
 *
 * and s(b)/b falls with b, so one table of it serves every window.
 */
import { DomainError } from '../errors.ts';
import { type Goal, type GoalCondition, goalCondition, sumOf, totalOf, type WindowRates } from './goal.ts';
import { neededExposure } from './needed-exposure.ts';

/** Fewer windows than this are done one by one. */
const FEW = 8;
/** Distance of the table's nodes in ln b. */
const STEP = 0.05;
/** … and how many of them there may be: a wider range has wider steps. */
const MOST_NODES = 400;

/**
 * neededExposure of each window, kg yr; Infinity where none reaches the goal. The windows have the same backgrounds but
 * for their rates.
 *
 * Accuracy: neededExposure's; for mean upper limits over a background 1e-5, unified ones, which have corners in b, 5e-3
 * (test/physics/exposure/many-exposures.test.ts). Cost of the latter: a few hundred mean limits, however many windows.
 *
 * @throws DomainError as neededExposure, and for no windows
 */
export function neededExposuresKgYr(windows: readonly WindowRates[], goal: Goal): Float64Array {
  if (windows.length === 0) throw new DomainError('windows', 0, 'at least one window');
  const condition = goalCondition(goal, windows[0].backgrounds);
  const one = (window: WindowRates): number => neededExposure(window, goal).neededKgYr ?? Infinity;
  const out = new Float64Array(windows.length);
  const ratios = windows.map((window) => sumOf(window.signalPerKgYr) / sumOf(totalOf(window)));
  const isTabulated = ratios.map((ratio) => condition.kind === 'upper-limit' && ratio > 0 && ratio < Infinity);
  const tabulated = ratios.filter((_, i) => isTabulated[i]);
  const background = tabulated.length > FEW ? backgroundTable(windows, ratios, isTabulated, one, condition) : undefined;
  windows.forEach((window, i) => {
    out[i] = background && isTabulated[i] ? background(ratios[i]) / sumOf(totalOf(window)) : one(window);
  });
  return out;
}

/** b by S/B, from a table between the least and the largest ratio. */
function backgroundTable(
  windows: readonly WindowRates[],
  ratios: readonly number[],
  isTabulated: readonly boolean[],
  one: (window: WindowRates) => number,
  condition: GoalCondition,
): ((ratio: number) => number) | undefined {
  if (condition.kind !== 'upper-limit') return undefined;
  const order = ratios.map((_, i) => i).filter((i) => isTabulated[i]);
  order.sort((i, j) => ratios[j] - ratios[i]);
  const eventsAt = (i: number): number => one(windows[i]) * sumOf(totalOf(windows[i]));
  const [from, to] = [eventsAt(order[0]), eventsAt(order[order.length - 1])].map(Math.log);
  if (!(Number.isFinite(from) && Number.isFinite(to))) return undefined;
  const steps = Math.min(MOST_NODES, Math.max(4, Math.ceil((to - from) / STEP) + 2));
  const width = Math.max(STEP, (to - from) / (steps - 2));
  const lnB = Float64Array.from({ length: steps + 1 }, (_, k) => from + width * (k - 1));
  const lnRatio = lnB.map((x) => Math.log(condition.meanLimit(Math.exp(x))) - x);
  return (ratio) => {
    const y = Math.log(ratio);
    let k = 0;
    while (k < steps - 1 && lnRatio[k + 1] > y) k++;
    const first = Math.min(Math.max(k - 1, 0), steps - 3);
    return Math.exp(cubicThrough(lnRatio, lnB, first, y));
  };
}

/** The cubic through four neighbouring points, at y. */
function cubicThrough(ys: Float64Array, xs: Float64Array, first: number, y: number): number {
  let sum = 0;
  for (let i = first; i < first + 4; i++) {
    let product = xs[i];
    for (let j = first; j < first + 4; j++) if (j !== i) product *= (y - ys[j]) / (ys[i] - ys[j]);
    sum += product;
  }
  return sum;
}
