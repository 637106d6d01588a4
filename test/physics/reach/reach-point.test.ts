import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import {
  type Background,
  type Goal,
  type NeededExposure,
  neededExposure,
} from '../../../physics/exposure/needed-exposure.ts';
import { type ReachPoint, reachPoints } from '../../../physics/reach/reach-point.ts';

function known(ratesPerKgYr: readonly number[]): Background {
  return { name: 'known', ratesPerKgYr, relativeUncertainty: 0 };
}

function uncertain(ratesPerKgYr: readonly number[], relativeUncertainty: number): Background {
  return { name: 'uncertain', ratesPerKgYr, relativeUncertainty };
}

/** σ̄ₑ of the rates that the tests invent, cm². */
const SIGMA = 1e-37;

function reach(
  goal: Goal,
  exposureKgYr: number,
  ratesPerKgYr: readonly number[],
  ...backgrounds: Background[]
): ReachPoint {
  return reachPoints({ goal, exposureKgYr, backgrounds })({ crossSectionCm2: SIGMA, ratesPerKgYr });
}

const LINEAR_GOALS: Goal[] = [
  { kind: 'events', count: 3 },
  { kind: 'detection', atLeast: 2, probability: 0.9 },
];
const LIMIT_GOALS: Goal[] = [
  { kind: 'exclusion', confidence: 0.9 },
  { kind: 'exclusion', confidence: 0.95, method: 'counting' },
  { kind: 'exclusion', confidence: 0.9, method: 'unified' },
];
const LIKELIHOOD_GOALS: Goal[] = [
  { kind: 'exclusion', confidence: 0.9, method: 'likelihood' },
  { kind: 'discovery', significance: 3 },
  { kind: 'discovery', significance: 5, minimumEvents: 1 },
];
const KNOWN_GOALS = [...LINEAR_GOALS, ...LIMIT_GOALS, ...LIKELIHOOD_GOALS];
const UNCERTAIN_GOALS = [...LINEAR_GOALS, ...LIKELIHOOD_GOALS];

const rate = fc.double({ min: 0.05, max: 100, noNaN: true });
const threeRates = fc.array(rate, { minLength: 3, maxLength: 3 });

/** The reach at the exposure that these rates need, in units of the cross section they are for; undefined where none suffices. */
function thereAndBack(
  goal: Goal,
  rates: readonly number[],
  backgrounds: readonly Background[],
): { ratio: number; needed: NeededExposure; point: ReachPoint } | undefined {
  const needed = neededExposure({ signalPerKgYr: rates, backgrounds }, goal);
  if (needed.neededKgYr === null) return undefined;
  const point = reach(goal, needed.neededKgYr, rates, ...backgrounds);
  return { ratio: point.crossSectionCm2! / SIGMA, needed, point };
}

/** The error bounds of both directions: roots to 1e-11 in the logarithm, mean limits to 1e-9. */
const IDENTITY = 1e-8;

describe('reachPoints', () => {
  it('for events is their number over the events at the reference cross section', () => {
    const point = reach({ kind: 'events', count: 6 }, 1.5, [1, 3], known([2, 0]));
    expect(point).toMatchObject({ expectedBackground: 3, binding: 'events' });
    expect(point.expectedSignal).toBeCloseTo(6, 12);
    expect(point.crossSectionCm2! / SIGMA).toBeCloseTo(1, 12);
  });

  // Closed forms without background: events μ with P(N ≥ k) = p, or −ln(1 − confidence); 2.436: Feldman & Cousins, table (n = 0, b = 0).
  it.each([
    { goal: { kind: 'detection', atLeast: 1, probability: 0.9 }, events: Math.log(10), digits: 11 },
    { goal: { kind: 'exclusion', confidence: 0.95 }, events: Math.log(20), digits: 11 },
    { goal: { kind: 'exclusion', confidence: 0.9, method: 'unified' }, events: 2.436, digits: 2 },
    { goal: { kind: 'exclusion', confidence: 0.9, method: 'likelihood' }, events: Math.log(10), digits: 11 },
    { goal: { kind: 'discovery', significance: 5 }, events: 3, digits: 11 },
  ] as { goal: Goal; events: number; digits: number }[])(
    'without background needs $events events ($goal.kind, $goal.method)',
    ({ goal, events, digits }) => {
      const point = reach(goal, 0.1, [40, 2]);
      expect(point.expectedSignal!).toBeCloseTo(events, digits);
      expect(point.crossSectionCm2! / SIGMA).toBeCloseTo(point.expectedSignal! / 4.2, 12);
    },
  );

  // Cowan et al. (2011): s = 10, b = 9 gives Z = 2.8973 and s = 5, b = 1 gives 3.3913 (the project's physics notes: rounded to 5 digits, so 3e-5 in s).
  it.each([
    { significance: 2.8973, background: 9, signal: 10 },
    { significance: 3.3913, background: 1, signal: 5 },
  ])(
    'for a discovery of $significance σ above $background needs $signal events',
    ({ significance, background, signal }) => {
      const point = reach({ kind: 'discovery', significance }, 1, [1], known([background]));
      expect(Math.abs(point.expectedSignal! / signal - 1)).toBeLessThan(3e-5);
      expect(point.binding).toBe('significance');
    },
  );

  // The project's physics notes, Statistics: 1.645 (median CLs), 1.755 (mean CLs), 1.734 (mean unified). Corrections are a few/√b with √b = 1e5.
  it.each([
    { method: 'likelihood', slope: 1.645 },
    { method: 'counting', slope: 1.755 },
    { method: 'unified', slope: 1.734 },
  ] as const)('for exclusion by $method at large background tends to $slope √b events', ({ method, slope }) => {
    const point = reach({ kind: 'exclusion', confidence: 0.9, method }, 1, [7], known([1e10]));
    expect(Math.abs(point.expectedSignal! / 1e5 - slope)).toBeLessThan(6e-4);
  });

  it.each(KNOWN_GOALS)(
    'returns the cross section at the exposure it needs, known backgrounds ($kind, $method)',
    (goal) => {
      let compared = 0;
      fc.assert(
        fc.property(threeRates, threeRates, (rates, background) => {
          const { ratio } = thereAndBack(goal, rates, [known(background)])!;
          expect(Math.abs(ratio - 1)).toBeLessThan(IDENTITY);
          compared++;
        }),
        { numRuns: 15, seed: 4 },
      );
      expect(compared).toBe(15);
    },
  );

  it.each(KNOWN_GOALS)('returns the cross section at the exposure it needs, no background ($kind, $method)', (goal) => {
    fc.assert(
      fc.property(threeRates, (rates) => {
        expect(Math.abs(thereAndBack(goal, rates, [])!.ratio - 1)).toBeLessThan(IDENTITY);
      }),
      { numRuns: 15, seed: 4 },
    );
  });

  it.each(UNCERTAIN_GOALS)(
    'returns the cross section at the exposure it needs, uncertain backgrounds ($kind, $method)',
    (goal) => {
      let compared = 0;
      fc.assert(
        fc.property(threeRates, threeRates, threeRates, (rates, one, other) => {
          const found = thereAndBack(goal, rates, [uncertain(one, 0.05), uncertain(other, 0.2), known(rates)]);
          if (!found) return;
          expect(Math.abs(found.ratio - 1)).toBeLessThan(IDENTITY);
          compared++;
        }),
        { numRuns: 40, seed: 4 },
      );
      expect(compared).toBeGreaterThan(20);
    },
  );

  it.each(LIKELIHOOD_GOALS)(
    'returns the cross section where some bins have no background ($kind, $significance)',
    (goal) => {
      fc.assert(
        fc.property(threeRates, rate, (rates, background) => {
          const { ratio, needed, point } = thereAndBack(goal, rates, [known([0, background, 10 * background])])!;
          expect(Math.abs(ratio - 1)).toBeLessThan(IDENTITY);
          expect(point.binding).toBe(needed.binding);
        }),
        { numRuns: 30, seed: 4 },
      );
    },
  );

  it.each(KNOWN_GOALS)('halves at twice a background-free exposure ($kind, $method)', (goal) => {
    const once = reach(goal, 0.7, [2, 5, 0.1]).crossSectionCm2!;
    expect(Math.abs(reach(goal, 1.4, [2, 5, 0.1]).crossSectionCm2! / once - 0.5)).toBeLessThan(1e-10);
  });

  it.each(KNOWN_GOALS)('does not depend on the cross section the rates were computed for ($kind, $method)', (goal) => {
    const find = reachPoints({ goal, exposureKgYr: 1, backgrounds: [known([3, 1])] });
    const one = find({ crossSectionCm2: 1e-37, ratesPerKgYr: [2, 1] }).crossSectionCm2!;
    const far = find({ crossSectionCm2: 1, ratesPerKgYr: [2e37, 1e37] }).crossSectionCm2!;
    expect(Math.abs(far / one - 1)).toBeLessThan(1e-10);
  });

  it.each(KNOWN_GOALS)('never falls when background is added to bins that have some ($kind, $method)', (goal) => {
    fc.assert(
      fc.property(threeRates, threeRates, threeRates, (rates, background, more) => {
        const before = reach(goal, 1, rates, known(background)).crossSectionCm2!;
        const after = reach(goal, 1, rates, known(background), known(more)).crossSectionCm2!;
        expect(after).toBeGreaterThanOrEqual(before * (1 - 1e-9));
      }),
      { numRuns: 10, seed: 4 },
    );
  });

  it('for discovery takes the jump of the bins without background if it comes first, and the smallest cross section past it', () => {
    const goal: Goal = { kind: 'discovery', significance: 5 };
    const shared = reach(goal, 10, [1], known([50])).crossSectionCm2!;
    // The pool has 10 × 0.3 = 3 events at the reference cross section: the jump is there, before the shared bin's 5 σ.
    expect(shared).toBeGreaterThan(SIGMA);
    const jump = reach(goal, 10, [1, 0.1, 0.2], known([50, 0, 0]));
    expect(jump.binding).toBe('minimum-events');
    expect(jump.crossSectionCm2! / SIGMA).toBeCloseTo(1, 12);
    // Just below the jump the same search is not there yet: it needs a longer exposure.
    const below = neededExposure(
      { signalPerKgYr: [1, 0.1, 0.2].map((s) => s * (1 - 1e-9)), backgrounds: [known([50, 0, 0])] },
      goal,
    );
    expect(below.neededKgYr!).toBeGreaterThan(10);
    // A pool that is a thousand times weaker changes nothing.
    expect(reach(goal, 10, [1, 0.0003], known([50, 0])).crossSectionCm2! / shared).toBeCloseTo(1, 9);
  });

  it('for discovery without shared signal is set by the pool alone', () => {
    const point = reach({ kind: 'discovery', significance: 5 }, 1, [0, 6], known([9, 0]));
    expect(point).toMatchObject({ binding: 'minimum-events' });
    expect(point.crossSectionCm2! / SIGMA).toBeCloseTo(0.5, 12);
  });

  it('is reached where uncertainties keep any exposure from it: only the signal must be larger', () => {
    const goal: Goal = { kind: 'discovery', significance: 3 };
    const backgrounds = [uncertain([20], 0.1)];
    expect(neededExposure({ signalPerKgYr: [2], backgrounds }, goal).reason).toBe('systematic-uncertainty');
    // X → ∞, one bin: Z² = (2/r²)[t − ln(1 + t)], t = signal over background (Cowan et al. (2011) in that limit).
    const point = reach(goal, 1e12, [2], ...backgrounds);
    const t = point.expectedSignal! / point.expectedBackground;
    expect(Math.abs((2 / 0.01) * (t - Math.log1p(t)) - 9)).toBeLessThan(1e-6);
  });

  it.each([1e3, 1e6])('is reached also above a background uncertain by a factor %d', (r) => {
    const goal: Goal = { kind: 'discovery', significance: 5 };
    const point = reach(goal, 1, [1], uncertain([10], r));
    // s ≫ b: θ = (b + s + 1/r²)/(b + 1/r²) cannot be told from b θ; Z² → (2/r²)[θ − 1 − ln θ] with θ = 1 + s/b (to 1/s).
    const theta = 1 + point.expectedSignal! / 10;
    expect(Math.abs(((2 / r ** 2) * (theta - 1 - Math.log(theta))) / 25 - 1)).toBeLessThan(1e-4);
  });

  it.each(KNOWN_GOALS)('is null without signal, and says why ($kind, $method)', (goal) => {
    for (const rates of [
      [0, 0],
      [1e-320, 0],
    ]) {
      expect(reach(goal, 1, rates, known([1, 1]))).toEqual({
        crossSectionCm2: null,
        relativeError: 0,
        expectedSignal: null,
        expectedBackground: 2,
        binding: null,
        reason: 'no-signal',
      });
    }
  });

  it.each(KNOWN_GOALS)('carries the error of the rates ($kind, $method)', (goal) => {
    const find = reachPoints({ goal, exposureKgYr: 1, backgrounds: [known([3, 3])] });
    const signal = { crossSectionCm2: SIGMA, ratesPerKgYr: [2, 2] };
    const same = find({ ...signal, relativeErrors: [1e-4, 1e-4] }).relativeError;
    expect(Math.abs(same / 1e-4 - 1)).toBeLessThan(1e-3);
    // Bins that are alike share the error evenly.
    const one = find({ ...signal, relativeErrors: [1e-4, 0] }).relativeError;
    expect(Math.abs(one / 0.5e-4 - 1)).toBeLessThan(1e-3);
  });

  it('refuses numbers outside their domain', () => {
    const goal: Goal = { kind: 'events', count: 3 };
    const signal = { crossSectionCm2: SIGMA, ratesPerKgYr: [1] };
    for (const exposureKgYr of [0, -1, Number.NaN, Infinity])
      expect(() => reachPoints({ goal, exposureKgYr, backgrounds: [] })).toThrow(DomainError);
    const find = reachPoints({ goal, exposureKgYr: 1, backgrounds: [known([1])] });
    expect(() => find({ ...signal, crossSectionCm2: 0 })).toThrow(/crossSection/);
    expect(() => find({ ...signal, ratesPerKgYr: [1, 1] })).toThrow(/as many bins/);
    expect(() => find({ ...signal, ratesPerKgYr: [-1] })).toThrow(DomainError);
    expect(() => find({ ...signal, ratesPerKgYr: [1e101] })).toThrow(/fewer than 1e\+100 events/);
    for (const method of ['counting', 'unified'] as const) {
      const exclusion: Goal = { kind: 'exclusion', confidence: 0.9, method };
      expect(() => reachPoints({ goal: exclusion, exposureKgYr: 1, backgrounds: [uncertain([1], 0.1)] })).toThrow(
        /likelihood/,
      );
    }
  });
});
