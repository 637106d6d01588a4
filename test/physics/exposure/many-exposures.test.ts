import { describe, expect, it } from 'vitest';
import { neededExposuresKgYr } from '../../../physics/exposure/many-exposures.ts';
import { type Goal, neededExposure, type WindowRates } from '../../../physics/exposure/needed-exposure.ts';
import { seededRandom } from '../../../physics/exposure/random.ts';

const random = seededRandom(5);
const windowsOver = (background: number, count: number): WindowRates[] =>
  Array.from({ length: count }, () => {
    const signal = 10 * Math.exp(1.5 * (random() - 0.5));
    return {
      signalPerKgYr: [signal, signal / 3],
      backgrounds: [
        { name: 'a', ratesPerKgYr: [background * (1 + 0.1 * random()), background / 5], relativeUncertainty: 0 },
      ],
    };
  });

describe('neededExposuresKgYr', () => {
  const goals: [Goal, number][] = [
    [{ kind: 'events', count: 3 }, 1e-15],
    [{ kind: 'detection', atLeast: 3, probability: 0.9 }, 1e-15],
    [{ kind: 'exclusion', confidence: 0.9 }, 1e-5],
    [{ kind: 'exclusion', confidence: 0.95, method: 'unified' }, 5e-3], // the mean unified limit has corners in b
    [{ kind: 'exclusion', confidence: 0.9, method: 'likelihood' }, 1e-15],
    [{ kind: 'discovery', significance: 3 }, 1e-15],
  ];
  it.each(goals)('%j: as neededExposure one by one', (goal, tolerance) => {
    let compared = 0;
    for (const background of [0, 0.3, 40]) {
      const windows = windowsOver(background, 12);
      const all = neededExposuresKgYr(windows, goal);
      windows.forEach((window, i) => {
        const one = neededExposure(window, goal).neededKgYr!;
        expect(Math.abs(all[i] / one - 1)).toBeLessThanOrEqual(tolerance);
        compared++;
      });
    }
    expect(compared).toBe(36);
  });

  it('is Infinity where no exposure reaches the goal, and the same for windows that are all alike', () => {
    const [window] = windowsOver(5, 1);
    const empty = { ...window, signalPerKgYr: [0, 0] };
    const goal: Goal = { kind: 'exclusion', confidence: 0.9 };
    const all = neededExposuresKgYr([empty, ...Array.from({ length: 20 }, () => window)], goal);
    expect(all[0]).toBe(Infinity);
    const one = neededExposure(window, goal).neededKgYr!;
    for (const value of all.slice(1)) expect(Math.abs(value / one - 1)).toBeLessThan(1e-5);
    expect(() => neededExposuresKgYr([], goal)).toThrow(/windows/);
  });
});
