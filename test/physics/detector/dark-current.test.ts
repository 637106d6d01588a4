import { describe, expect, it } from 'vitest';
import { type DarkCurrent, darkCurrentRates } from '../../../physics/detector/dark-current.ts';
import { readoutResponse } from '../../../physics/detector/readout.ts';
import { DomainError } from '../../../physics/errors.ts';

const SENSOR: DarkCurrent = { electronsPerPixelPerDay: 1e-4, pixelMassKg: 0.35e-9, readoutIntervalDays: 1 };
const READINGS = 365.25 / 0.35e-9; // per kg yr, at one a day

/** Uniform numbers in [0, 1): a 32-bit state advanced by an odd constant and mixed. */
function uniformFrom(seed: number): () => number {
  let state = seed;
  return () => {
    state = (state + 0x6d2b79f5) | 0;
    let x = Math.imul(state ^ (state >>> 15), 1 | state);
    x = (x + Math.imul(x ^ (x >>> 7), 61 | x)) ^ x;
    return ((x ^ (x >>> 14)) >>> 0) / 2 ** 32;
  };
}

describe('darkCurrentRates', () => {
  it('is the Poisson distribution times the readings per kg yr', () => {
    // λ, n, P(n; λ) at 40 digits with a general-purpose multiprecision library
    const cases: readonly (readonly [number, number, number])[] = [
      [1e-4, 0, 0.9999000049998333],
      [1e-4, 1, 9.999000049998334e-5],
      [1e-4, 2, 4.999500024999167e-9],
      [1e-4, 4, 4.166250020832639e-18],
      [1e-12, 3, 1.666666666665e-37],
      [3.7, 5, 0.1428689297039647],
      [120, 100, 0.0068042948039043006],
    ];
    for (const [lambda, n, expected] of cases) {
      const rates = darkCurrentRates({ ...SENSOR, electronsPerPixelPerDay: lambda }, n);
      expect(Math.abs(rates[n] / READINGS / expected - 1)).toBeLessThan(1e-13);
    }
    expect(cases.length).toBe(7);
  });

  it('adds up to all readings, empty ones included, and to the current itself in electrons', () => {
    for (const electronsPerPixelPerDay of [0, 1e-9, 1e-4, 0.3, 4]) {
      const rates = darkCurrentRates({ ...SENSOR, electronsPerPixelPerDay }, 60);
      expect(rates.reduce((a, b) => a + b) / READINGS).toBeCloseTo(1, 13);
      const mean = rates.reduce((total, rate, n) => total + n * rate, 0) / READINGS;
      expect(Math.abs(mean - electronsPerPixelPerDay)).toBeLessThanOrEqual(1e-12 * electronsPerPixelPerDay);
    }
  });

  it('at zero current every pixel is empty', () => {
    const rates = darkCurrentRates({ ...SENSOR, electronsPerPixelPerDay: 0 }, 3);
    expect(rates[0] / READINGS).toBeCloseTo(1, 14);
    expect([...rates.subarray(1)]).toEqual([0, 0, 0]);
  });

  it('pile-up: the n-electron rate grows as interval^(n−1)', () => {
    const intervals = [1, 0.1, 0.01, 1e-3];
    for (let n = 1; n <= 5; n++) {
      const rates = intervals.map((readoutIntervalDays) => darkCurrentRates({ ...SENSOR, readoutIntervalDays }, n)[n]);
      for (let i = 1; i < intervals.length; i++) {
        const power = Math.log(rates[0] / rates[i]) / Math.log(intervals[0] / intervals[i]);
        expect(Math.abs(power - (n - 1))).toBeLessThan(1e-4); // e^{−λ} adds λ/ln(interval ratio) = 4e-5
      }
    }
  });

  it('agrees with a simulation of pixels that collect electrons one by one and are read with noise', () => {
    const pixels = 1_000_000;
    const darkCurrent = { electronsPerPixelPerDay: 0.05, pixelMassKg: 2e-9, readoutIntervalDays: 3 };
    const noiseElectrons = 0.25;
    const uniform = uniformFrom(20260607);
    const counts = new Float64Array(6);
    for (let pixel = 0; pixel < pixels; pixel++) {
      let charge = 0;
      for (let time = 0; ; charge++) {
        time -= Math.log1p(-uniform()) / darkCurrent.electronsPerPixelPerDay;
        if (time > darkCurrent.readoutIntervalDays) break;
      }
      const normal = Math.sqrt(-2 * Math.log1p(-uniform())) * Math.cos(2 * Math.PI * uniform());
      counts[Math.min(5, Math.max(0, Math.round(charge + noiseElectrons * normal)))]++;
    }
    const response = readoutResponse({ noiseElectrons, efficiency: 1, maxElectrons: 4 });
    const { bins, above } = response.apply(darkCurrentRates(darkCurrent, response.lastElectron));
    const exposureKgYear = (pixels * darkCurrent.pixelMassKg * darkCurrent.readoutIntervalDays) / 365.25;
    [...bins, above].forEach((rate, n) => {
      const expected = rate * exposureKgYear;
      expect(Math.abs(counts[n] - expected)).toBeLessThan(4 * Math.sqrt(expected) + 1);
    });
    expect(bins[3] * exposureKgYear).toBeGreaterThan(100); // pile-up is seen, not just allowed
  });

  it.each([
    [{ electronsPerPixelPerDay: -1 }, 'current'],
    [{ pixelMassKg: 0 }, 'pixelMass'],
    [{ readoutIntervalDays: Number.NaN }, 'readoutInterval'],
  ])('%j is refused at %s', (change, path) => {
    try {
      darkCurrentRates({ ...SENSOR, ...change }, 3);
      expect.unreachable();
    } catch (error) {
      expect((error as DomainError).parameter).toEqual([path]);
      expect(error).toBeInstanceOf(DomainError);
    }
  });
});
