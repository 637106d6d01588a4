import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { type Goal, neededExposure, type WindowRates } from '../../../physics/exposure/needed-exposure.ts';
import { logPoissonProbability } from '../../../physics/exposure/poisson.ts';
import { poissonSampler } from '../../../physics/exposure/poisson-sampling.ts';
import { pseudoExperiments } from '../../../physics/exposure/pseudo-experiments.ts';
import { seededRandom } from '../../../physics/exposure/random.ts';

const OPTIONS = { experiments: 4000, seed: 1 };
/** Enough standard errors that a fixed seed is not a lucky one; the tests are deterministic. */
const ERRORS_ALLOWED = 4;

const BIN_SHAPES = [0, 1, 2, 3];
const WINDOW: WindowRates = {
  signalPerKgYr: [20, 10, 5, 2],
  backgrounds: BIN_SHAPES.slice(0, 2).map((j) => ({
    name: `background ${j}`,
    ratesPerKgYr: BIN_SHAPES.map((i) => 40 / (1 + Math.abs(i - 3 * j))),
    relativeUncertainty: 0,
  })),
};
const UNCERTAIN: WindowRates = {
  ...WINDOW,
  backgrounds: WINDOW.backgrounds.map((background) => ({ ...background, relativeUncertainty: 0.1 })),
};

function simulated(window: WindowRates, goal: Goal, options = OPTIONS) {
  const { neededKgYr } = neededExposure(window, goal);
  return pseudoExperiments(window, goal, neededKgYr!, options)!;
}

describe('pseudoExperiments', () => {
  it.each<Goal>([
    { kind: 'events', count: 3 },
    { kind: 'detection', atLeast: 2, probability: 0.9 },
    { kind: 'exclusion', confidence: 0.9 },
    { kind: 'exclusion', confidence: 0.9, method: 'unified' },
  ])('agrees with the exact expectation within its error ($kind, $method)', (goal) => {
    const { achieved, expected, standardError } = simulated(WINDOW, goal);
    expect(Math.abs(achieved - expected)).toBeLessThan(ERRORS_ALLOWED * standardError);
  });

  it('of a detection finds the asked probability', () => {
    expect(simulated(WINDOW, { kind: 'detection', atLeast: 2, probability: 0.9 }).expected).toBeCloseTo(0.9, 10);
  });

  it.each<Goal>([
    { kind: 'exclusion', confidence: 0.9, method: 'likelihood' },
    { kind: 'discovery', significance: 3 },
    { kind: 'discovery', significance: 5 },
  ])('has a median significance near the Asimov one with tens of events ($kind)', (goal) => {
    for (const window of [WINDOW, UNCERTAIN]) {
      const { achieved, expected, standardError } = simulated(window, goal);
      // The Asimov value is asymptotic: within 5 % here, where the answer would bring no notice.
      expect(Math.abs(achieved / expected - 1)).toBeLessThan(0.05 + (ERRORS_ALLOWED * standardError) / expected);
    }
  });

  it('covers the signal at least as often as the confidence', () => {
    for (const method of ['counting', 'unified'] as const) {
      const { coverage } = simulated(WINDOW, { kind: 'exclusion', confidence: 0.9, method });
      expect(coverage).toBeGreaterThan(0.9 - ERRORS_ALLOWED * Math.sqrt(0.09 / OPTIONS.experiments));
    }
  });

  it('of one bin gives the median of the closed significance (known background: √q of the median count)', () => {
    const window = { signalPerKgYr: [50], backgrounds: [{ name: 'b', ratesPerKgYr: [100], relativeUncertainty: 0 }] };
    const { achieved } = pseudoExperiments(window, { kind: 'discovery', significance: 3 }, 1, OPTIONS)!;
    // The median of Poisson(150) is 150, give or take a count at 4000 experiments.
    const z = (n: number): number => Math.sqrt(2 * (n * Math.log(n / 100) - (n - 100)));
    expect(achieved).toBeGreaterThan(z(149) - 1e-6);
    expect(achieved).toBeLessThan(z(151) + 1e-6);
  });

  it('of an unbounded discovery counts the experiments with the minimum of events', () => {
    const goal: Goal = { kind: 'discovery', significance: 5 };
    const answer = simulated({ signalPerKgYr: [1], backgrounds: [] }, goal);
    expect(answer.quantity).toBe('fraction');
    expect(answer.expected).toBeCloseTo(1 - Math.exp(-3) * (1 + 3 + 4.5), 12);
  });

  it('is the same for the same seed, another for another', () => {
    const goal: Goal = { kind: 'discovery', significance: 3 };
    expect(simulated(UNCERTAIN, goal)).toEqual(simulated(UNCERTAIN, goal));
    expect(simulated(UNCERTAIN, goal, { ...OPTIONS, seed: 2 }).achieved).not.toBe(simulated(UNCERTAIN, goal).achieved);
  });

  it('refuses too few experiments and seeds that are not whole', () => {
    const goal: Goal = { kind: 'events', count: 3 };
    expect(() => pseudoExperiments(WINDOW, goal, 1, { experiments: 10, seed: 1 })).toThrow(DomainError);
    expect(() => pseudoExperiments(WINDOW, goal, 1, { experiments: 1000, seed: 0.5 })).toThrow(DomainError);
  });
});

describe('poissonSampler', () => {
  it.each([0, 0.4, 9.9, 10.1, 80, 3000])(
    'draws counts of mean %d with the right frequencies (χ² over counts)',
    (mean) => {
      const draw = poissonSampler(mean);
      const random = seededRandom(7);
      const draws = 50_000;
      const counts = new Map<number, number>();
      for (let k = 0; k < draws; k++) {
        const n = draw(random);
        counts.set(n, (counts.get(n) ?? 0) + 1);
      }
      let chiSquared = 0;
      let cells = 0;
      for (let n = Math.max(0, Math.floor(mean - 6 * Math.sqrt(mean))); n <= mean + 6 * Math.sqrt(mean) + 10; n++) {
        const expected = draws * Math.exp(logPoissonProbability(n, mean));
        if (expected < 10) continue;
        chiSquared += ((counts.get(n) ?? 0) - expected) ** 2 / expected;
        cells++;
      }
      // χ² has mean and half-variance equal to the number of cells.
      expect(chiSquared).toBeLessThan(cells + ERRORS_ALLOWED * Math.sqrt(2 * cells));
    },
  );
});

describe('seededRandom', () => {
  it('is uniform: mean ½ and variance 1/12 over 10⁵ draws', () => {
    const random = seededRandom(123456789012);
    let [mean, square] = [0, 0];
    for (let k = 0; k < 1e5; k++) {
      const u = random();
      expect(u >= 0 && u < 1).toBe(true);
      mean += u / 1e5;
      square += u ** 2 / 1e5;
    }
    expect(Math.abs(mean - 0.5)).toBeLessThan(ERRORS_ALLOWED * Math.sqrt(1 / 12 / 1e5));
    expect(Math.abs(square - 1 / 3)).toBeLessThan(ERRORS_ALLOWED * Math.sqrt(4 / 45 / 1e5));
  });

  it('tells seeds beyond 32 bits apart', () => {
    expect(seededRandom(1)()).not.toBe(seededRandom(1 + 2 ** 32)());
  });
});
