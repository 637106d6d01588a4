import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { asimovDeviance } from '../../../physics/exposure/asimov.ts';
import {
  type Background,
  type Goal,
  neededExposure,
  type WindowRates,
} from '../../../physics/exposure/needed-exposure.ts';

function known(ratesPerKgYr: readonly number[]): Background {
  return { name: 'known', ratesPerKgYr, relativeUncertainty: 0 };
}

function uncertain(ratesPerKgYr: readonly number[], relativeUncertainty: number): Background {
  return { name: 'uncertain', ratesPerKgYr, relativeUncertainty };
}

function window(signalPerKgYr: readonly number[], ...backgrounds: Background[]): WindowRates {
  return { signalPerKgYr, backgrounds };
}

function needed(rates: WindowRates, goal: Goal): number {
  return neededExposure(rates, goal).neededKgYr ?? Infinity;
}

const GOALS: Goal[] = [
  { kind: 'events', count: 3 },
  { kind: 'detection', atLeast: 2, probability: 0.9 },
  { kind: 'exclusion', confidence: 0.9 },
  { kind: 'exclusion', confidence: 0.9, method: 'unified' },
  { kind: 'exclusion', confidence: 0.9, method: 'likelihood' },
  { kind: 'discovery', significance: 3 },
  { kind: 'discovery', significance: 5, minimumEvents: 1 },
];
const LIKELIHOOD_GOALS = GOALS.slice(4);

const rate = fc.double({ min: 0.05, max: 100, noNaN: true });
const threeRates = fc.array(rate, { minLength: 3, maxLength: 3 });

describe('neededExposure', () => {
  it('for events is their number over the signal rate, and reports what is expected there', () => {
    const answer = neededExposure(window([1, 3], known([2, 0])), { kind: 'events', count: 6 });
    expect(answer).toMatchObject({ neededKgYr: 1.5, expectedSignal: 6, expectedBackground: 3, binding: 'events' });
  });

  it('for detection of one event is −ln(1 − p) over the signal rate', () => {
    expect(needed(window([2]), { kind: 'detection', atLeast: 1, probability: 0.9 })).toBeCloseTo(Math.log(10) / 2, 12);
  });

  it('for exclusion without background is 2.303 events, 2.436 unified', () => {
    const rates = window([2, 2]);
    expect(needed(rates, { kind: 'exclusion', confidence: 0.9 }) * 4).toBeCloseTo(Math.log(10), 12);
    expect(needed(rates, { kind: 'exclusion', confidence: 0.9, method: 'unified' }) * 4).toBeCloseTo(2.436, 3);
    const likelihood = neededExposure(rates, { kind: 'exclusion', confidence: 0.9, method: 'likelihood' });
    expect(likelihood.expectedSignal).toBeCloseTo(Math.log(10), 12);
    expect(likelihood.binding).toBe('minimum-events');
  });

  // The project's physics notes, Statistics: 1.645 (median CLs), 1.755 (mean CLs), 1.734 (mean unified). Corrections are a few/√b with √b = 1.7e5.
  it.each([
    { method: 'likelihood', slope: 1.645 },
    { method: 'counting', slope: 1.755 },
    { method: 'unified', slope: 1.734 },
  ] as const)('for exclusion by $method at large background tends to $slope √b', ({ method, slope }) => {
    const answer = neededExposure(window([1e-5], known([1])), { kind: 'exclusion', confidence: 0.9, method });
    expect(answer.expectedSignal! / Math.sqrt(answer.expectedBackground!)).toBeCloseTo(slope, 3);
  });

  it('for discovery reaches the asked significance', () => {
    const rates = window([5, 1], known([9, 20]), uncertain([1, 3], 0.2));
    const exposure = needed(rates, { kind: 'discovery', significance: 5 });
    const backgrounds = [
      { name: 'a', perBin: [9, 20], relativeUncertainty: 0 },
      { name: 'b', perBin: [1, 3], relativeUncertainty: 0.2 },
    ];
    expect(Math.sqrt(asimovDeviance('discovery', [5, 1], backgrounds)(exposure).q)).toBeCloseTo(5, 9);
  });

  it('for discovery never has fewer than the minimum of events', () => {
    const answer = neededExposure(window([1], known([1e-9])), { kind: 'discovery', significance: 3 });
    expect(answer).toMatchObject({ neededKgYr: 3, binding: 'minimum-events' });
  });

  it('for discovery leaves bins without background out until they have the minimum of events', () => {
    const shared = needed(window([1], known([50])), { kind: 'discovery', significance: 5 });
    // The pool needs 3/0.001 = 3000 kg yr, later than the shared bin: it changes nothing.
    expect(needed(window([1, 0.001], known([50, 0])), { kind: 'discovery', significance: 5 })).toBeCloseTo(shared, 9);
    // 3/0.3 = 10 kg yr, earlier: the significance jumps there.
    const jump = neededExposure(window([1, 0.1, 0.2], known([50, 0, 0])), { kind: 'discovery', significance: 5 });
    expect(shared).toBeGreaterThan(10);
    expect(jump.neededKgYr).toBeCloseTo(10, 12);
    expect(jump.binding).toBe('minimum-events');
  });

  it('is null where a systematic uncertainty caps the discovery, with the closed asymptote of one bin', () => {
    const [t, r] = [0.1, 0.1];
    const answer = neededExposure(window([t * 20], uncertain([20], r)), { kind: 'discovery', significance: 3 });
    // For X → ∞ θ = 1 + t: Z² = (2/r²)[t − ln(1 + t)].
    expect(answer).toMatchObject({ neededKgYr: null, reason: 'systematic-uncertainty', requiredSignificance: 3 });
    expect(Math.abs(answer.largestSignificance! - Math.sqrt(2 * (t - Math.log1p(t))) / r)).toBeLessThan(1e-6);
  });

  it('is null where a systematic uncertainty caps the exclusion, but not if the signal exceeds the background', () => {
    const goal: Goal = { kind: 'exclusion', confidence: 0.9, method: 'likelihood' };
    const answer = neededExposure(window([1], uncertain([10], 0.2)), goal);
    const largest = Math.sqrt(2 * (-0.1 - Math.log1p(-0.1))) / 0.2;
    expect(answer.neededKgYr).toBeNull();
    expect(Math.abs(answer.largestSignificance! - largest)).toBeLessThan(1e-6);
    expect(neededExposure(window([11], uncertain([10], 0.2)), goal).neededKgYr).not.toBeNull();
  });

  it('is null when several uncertain backgrounds can imitate the signal together, and finite when a bin tells them apart', () => {
    const goal: Goal = { kind: 'discovery', significance: 5 };
    const both = [uncertain([10, 0, 5], 0.1), uncertain([0, 10, 5], 0.1)];
    expect(neededExposure(window([1, 1, 1], ...both), goal).reason).toBe('systematic-uncertainty');
    expect(neededExposure(window([1, 1, 2], ...both), goal).neededKgYr).not.toBeNull();
  });

  it('is null without signal', () => {
    for (const goal of GOALS) {
      expect(neededExposure(window([0, 0], known([1, 1])), goal)).toMatchObject({
        neededKgYr: null,
        reason: 'no-signal',
      });
    }
  });

  it('refuses uncertain backgrounds with counting and unified, naming likelihood', () => {
    for (const method of ['counting', 'unified', undefined] as const) {
      const goal: Goal = method
        ? { kind: 'exclusion', confidence: 0.9, method }
        : { kind: 'exclusion', confidence: 0.9 };
      expect(() => neededExposure(window([1], uncertain([1], 0.1)), goal)).toThrow(/likelihood/);
    }
  });

  it('refuses numbers outside their domain', () => {
    const faults: Goal[] = [
      { kind: 'events', count: 0 },
      { kind: 'detection', atLeast: 1.5, probability: 0.9 },
      { kind: 'exclusion', confidence: 1 },
      { kind: 'discovery', significance: -1 },
      { kind: 'discovery', significance: 3, minimumEvents: 0 },
    ];
    for (const goal of faults) expect(() => neededExposure(window([1]), goal)).toThrow(DomainError);
  });

  it.each(GOALS)('scales: k times every rate needs 1/k of the exposure ($kind, $method)', (goal) => {
    fc.assert(
      fc.property(threeRates, threeRates, fc.double({ min: 0.01, max: 100, noNaN: true }), (s, b, k) => {
        const one = needed(window(s, known(b)), goal);
        const scaled = needed(
          window(
            s.map((x) => k * x),
            known(b.map((x) => k * x)),
          ),
          goal,
        );
        expect(Math.abs((scaled * k) / one - 1)).toBeLessThan(1e-9);
      }),
      { numRuns: 12, seed: 1 },
    );
  });

  it.each(GOALS)('never falls when background is added to bins that have some ($kind, $method)', (goal) => {
    fc.assert(
      fc.property(threeRates, threeRates, threeRates, (s, b, more) => {
        const before = needed(window(s, known(b)), goal);
        expect(needed(window(s, known(b), known(more)), goal)).toBeGreaterThanOrEqual(before * (1 - 1e-9));
      }),
      { numRuns: 12, seed: 1 },
    );
  });

  it.each(LIKELIHOOD_GOALS)('is unchanged when a bin is split in halves ($kind, $method)', (goal) => {
    fc.assert(
      fc.property(threeRates, threeRates, (s, b) => {
        const split = (x: number[]): number[] => [x[0], x[1], x[2] / 2, x[2] / 2];
        const whole = neededExposure(window(s, uncertain(b, 0.05), known(s)), goal);
        const halves = neededExposure(window(split(s), uncertain(split(b), 0.05), known(split(s))), goal);
        expect(halves.reason).toBe(whole.reason);
        if (whole.neededKgYr !== null) expect(Math.abs(halves.neededKgYr! / whole.neededKgYr - 1)).toBeLessThan(1e-8);
      }),
      { numRuns: 40, seed: 1 },
    );
  });

  it.each(LIKELIHOOD_GOALS)('tends to the known background as r → 0 ($kind, $method)', (goal) => {
    const one = needed(window([4, 2], known([6, 9])), goal);
    expect(Math.abs(needed(window([4, 2], uncertain([6, 9], 1e-5)), goal) / one - 1)).toBeLessThan(1e-7);
  });
});
