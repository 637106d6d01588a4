import { describe, expect, it } from 'vitest';
import { laboratorySpeedKmPerS, PECULIAR_VELOCITY_KM_PER_S } from '../../../physics/halo/earth-velocity.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import {
  annualAmplitude,
  daysOfYear,
  modulation,
  modulationExposureKgYr,
} from '../../../physics/modulation/modulation.ts';
import { response, responseRates } from '../../../physics/rate/response.ts';
import { builtInTable } from '../../support/built-in-table.ts';

const YEAR = daysOfYear(2026);
const utcDay = (ms: number): string => new Date(ms).toISOString().slice(0, 10);

describe('daysOfYear', () => {
  it('has 365 days, 366 in leap years (Gregorian rule), from 1 January 00:00 UTC to 31 December', () => {
    for (const [year, days] of [
      [2026, 365],
      [2028, 366],
      [2000, 366],
      [2100, 365],
    ]) {
      const all = daysOfYear(year);
      expect(all).toHaveLength(days);
      expect([all[0], all[days - 1]].map(utcDay)).toEqual([`${year}-01-01`, `${year}-12-31`]);
    }
    for (const year of [2026.5, 1949, 2101, Number.NaN]) expect(() => daysOfYear(year)).toThrow(/year/);
  });
});

describe('modulation', () => {
  it('is mean, half the swing, their ratio and the first maximum', () => {
    expect(modulation([1, 3, 2, 3])).toEqual({ mean: 2.25, amplitude: 1, fractionalAmplitude: 1 / 2.25, maximumAt: 1 });
    expect(modulation([0, 0])).toEqual({ mean: 0, amplitude: 0, fractionalAmplitude: 0, maximumAt: 0 });
  });

  it('of a cosine about a mean finds its amplitude and its day', () => {
    const rates = YEAR.map((_, day) => 10 + 0.3 * Math.cos((2 * Math.PI * (day - 151)) / 365));
    const { mean, amplitude, maximumAt } = modulation(rates);
    expect(mean).toBeCloseTo(10, 12);
    expect(amplitude).toBeCloseTo(0.3, 4); // the minimum falls between two days
    expect(utcDay(YEAR[maximumAt])).toBe('2026-06-01');
  });

  it('refuses no rates and rates that are no rates', () => {
    for (const rates of [[], [1, -1], [Number.NaN]]) expect(() => modulation(rates)).toThrow(/rates/);
  });
});

describe('annualAmplitude', () => {
  it('is the coefficient of the annual cosine whatever its phase, untouched by a constant and by other harmonics', () => {
    for (const phase of [0, 1, 2.5]) {
      const rates = YEAR.map((_, i) => {
        const t = (2 * Math.PI * i) / 365;
        return 7 + 2 * Math.cos(t - phase) + 0.9 * Math.cos(2 * t) + 0.4 * Math.sin(3 * t);
      });
      expect(annualAmplitude(rates)).toBeCloseTo(2, 12);
      expect(annualAmplitude([...rates, ...rates], 2)).toBeCloseTo(2, 12);
    }
    expect(annualAmplitude([5, 5, 5, 5])).toBeCloseTo(0, 14);
    expect(() => annualAmplitude([1, 2])).toThrow(/rates/);
  });
});

describe('modulationExposureKgYr', () => {
  it('gives back Z² = X Σ A²/[2 (S̄ + B)]', () => {
    expect(modulationExposureKgYr([{ annualAmplitude: 1, meanSignal: 10, background: 40 }], 3)).toBe(900);
    const bins = [
      { annualAmplitude: 2, meanSignal: 50, background: 0 },
      { annualAmplitude: 0.5, meanSignal: 3, background: 20 },
      { annualAmplitude: 0, meanSignal: 0, background: 0 },
    ];
    const x = modulationExposureKgYr(bins, 5)!;
    expect(x * (4 / 100 + 0.25 / 46)).toBeCloseTo(25, 10);
  });

  it('is the exposure at which a fitted cosine is Z times its error: a seeded Poisson experiment', () => {
    // 200 days of counts, large enough to be Gaussian: the fitted in-phase amplitude has variance 2 (S + B)/X
    const [signal, background, amplitude, exposure, trials] = [30, 70, 10, 50, 400];
    const perDay = exposure / 200;
    let seed = 12345;
    const uniform = (): number => {
      seed = (Math.imul(seed, 1103515245) + 12345) & 0x7fffffff;
      return seed / 0x80000000;
    };
    const normal = (): number => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform());
    const fitted = Array.from({ length: trials }, () => {
      let sum = 0;
      for (let day = 0; day < 200; day++) {
        const c = Math.cos((2 * Math.PI * day) / 200);
        const mean = (signal + background + amplitude * c) * perDay;
        sum += ((mean + Math.sqrt(mean) * normal()) / perDay) * c;
      }
      return (2 * sum) / 200;
    });
    const mean = fitted.reduce((a, b) => a + b, 0) / trials;
    const deviation = Math.sqrt(fitted.reduce((sum, a) => sum + (a - mean) ** 2, 0) / (trials - 1));
    const z = mean / deviation;
    const predicted = modulationExposureKgYr([{ annualAmplitude: amplitude, meanSignal: signal, background }], z)!;
    // the deviation of 400 trials is known to 3.5 %, X goes with its square: 4 standard errors
    expect(Math.abs(predicted / exposure - 1)).toBeLessThan(4 * 2 * 0.0355);
  });

  it('is undefined where nothing modulates, and refuses what is no significance', () => {
    expect(modulationExposureKgYr([{ annualAmplitude: 0, meanSignal: 1, background: 1 }], 3)).toBeUndefined();
    expect(modulationExposureKgYr([], 3)).toBeUndefined();
    expect(() => modulationExposureKgYr([], 0)).toThrow(/significance/);
  });
});

describe('modulation of a rate in silicon', () => {
  const { table, bandGapEv, energyPerPairEv } = builtInTable('silicon', true);
  const kernel = response(
    {
      massEv: 1e8,
      crossSectionCm2: 1e-37,
      mediator: { kind: 'heavy' },
      splittingEv: 0,
      localDensityGevPerCm3: 0.3,
      table,
      ionization: stepIonization(bandGapEv, energyPerPairEv),
      energyPerPairEv,
      maxElectrons: 8,
    },
    850,
  );
  const ratesAt = (laboratorySpeed: number): Float64Array =>
    responseRates(
      kernel,
      standardHalo({
        circularSpeedKmPerS: 238,
        escapeSpeedKmPerS: 544,
        laboratorySpeedKmPerS: laboratorySpeed,
        cutoff: 'sharp',
      }),
    );

  it('has the amplitude |dR/dv_E| × that of v_E, and its maximum with it or half a year off, in every bin', () => {
    const speeds = YEAR.map((ms) => laboratorySpeedKmPerS(238, PECULIAR_VELOCITY_KM_PER_S, ms));
    const ofSpeed = modulation(speeds);
    const days = speeds.map(ratesAt);
    const [below, at, above] = [-1, 0, 1].map((step) => ratesAt(ofSpeed.mean + step * 5));
    let compared = 0;
    for (let bin = 0; bin < 8; bin++) {
      const of = modulation(days.map((rates) => rates[bin]));
      const derivative = (above[bin] - below[bin]) / 10;
      const curvature = (above[bin] - 2 * at[bin] + below[bin]) / 25;
      const expected = Math.abs(derivative) * ofSpeed.amplitude;
      // what the second derivative bends over the swing, and the third, of the same order
      const second = Math.abs(curvature * ofSpeed.amplitude ** 2);
      expect(Math.abs(of.amplitude / expected - 1), `bin ${bin + 1}`).toBeLessThan(0.02 + second / expected);
      expect(of.fractionalAmplitude).toBeLessThan(0.5);
      if (derivative > 0 && second < 0.2 * expected) {
        expect(of.maximumAt).toBe(ofSpeed.maximumAt);
        compared++;
      }
    }
    expect(compared).toBeGreaterThanOrEqual(4);
  });
});
