/**
 * Times the exposure goals: `npx tsx test/bench/exposure.bench.ts`. Prints absolute times and the ratios that matter: a goal with
 * 12 bins and 5 uncertain backgrounds against the same without them, and 20,000 pseudo-experiments against one second.
 */
import { type Goal, neededExposure, type WindowRates } from '../../physics/exposure/needed-exposure.ts';
import { pseudoExperiments } from '../../physics/exposure/pseudo-experiments.ts';
import { meanUnifiedLimit, summedUnifiedLimit } from '../../physics/exposure/unified.ts';

const BINS = Array.from({ length: 12 }, (_, i) => i);
const SIGNAL = BINS.map((i) => 30 * Math.exp(-i / 1.5));
const ONE_KNOWN: WindowRates = {
  signalPerKgYr: SIGNAL,
  backgrounds: [{ name: 'flat', ratesPerKgYr: BINS.map(() => 15), relativeUncertainty: 0 }],
};
const FIVE_UNCERTAIN: WindowRates = {
  signalPerKgYr: SIGNAL,
  backgrounds: [0, 1, 2, 3, 4].map((j) => ({
    name: `background ${j}`,
    ratesPerKgYr: BINS.map((i) => 15 * Math.exp(-((i - 2 * j) ** 2) / 8) + 0.01),
    relativeUncertainty: 0.05 + 0.05 * j,
  })),
};
const GOALS: Goal[] = [
  { kind: 'exclusion', confidence: 0.9, method: 'likelihood' },
  { kind: 'discovery', significance: 5 },
];
const REPETITIONS = 15;
/** Runs timed together: the processor's clock is coarse. */
const TOGETHER = 40;

/** Median processor time of repeated runs, ms, after one that warms up: other processes do not count. */
function medianMs(run: () => unknown, repetitions: number, together = 1): number {
  run();
  const times = Array.from({ length: repetitions }, () => {
    const from = process.cpuUsage();
    for (let k = 0; k < together; k++) run();
    return process.cpuUsage(from).user / 1000 / together;
  });
  return times.sort((a, b) => a - b)[Math.floor(repetitions / 2)];
}

for (const goal of GOALS) {
  const one = medianMs(() => neededExposure(ONE_KNOWN, goal), REPETITIONS, TOGETHER);
  const five = medianMs(() => neededExposure(FIVE_UNCERTAIN, goal), REPETITIONS, TOGETHER);
  console.log(
    `${goal.kind}: one known background ${one.toFixed(3)} ms, five uncertain ${five.toFixed(3)} ms, ratio ${(five / one).toFixed(1)}`,
  );
  const { neededKgYr } = neededExposure(FIVE_UNCERTAIN, goal);
  const toys = medianMs(
    () => pseudoExperiments(FIVE_UNCERTAIN, goal, neededKgYr!, { experiments: 20_000, seed: 1 }),
    3,
  );
  console.log(
    `${goal.kind}: 20,000 pseudo-experiments ${toys.toFixed(0)} ms, ${(toys / 1000).toFixed(2)} of a second, ${(toys / five).toFixed(0)} goals`,
  );
}

for (const method of ['counting', 'unified'] as const) {
  const ms = medianMs(() => neededExposure(ONE_KNOWN, { kind: 'exclusion', confidence: 0.9, method }), 5);
  console.log(`exclusion by ${method}: ${ms.toFixed(1)} ms`);
}

for (const b of [10, 100, 1000, 10_000]) {
  const sum = medianMs(() => summedUnifiedLimit(b, 0.9), 3);
  const first = medianMs(() => meanUnifiedLimit(0.9)(b), 3);
  console.log(`mean unified limit at b = ${b}: sum ${sum.toFixed(1)} ms, first call ${first.toFixed(1)} ms`);
}
