import { describe, expect, it } from 'vitest';
import { darkCurrentBackground, flatBackground, perBinBackground } from '../../../physics/detector/backgrounds.ts';
import { readoutResponse } from '../../../physics/detector/readout.ts';
import type { DomainError } from '../../../physics/errors.ts';
import { fanoIonization } from '../../../physics/ionization/fano.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import { normalBetween } from '../../../physics/numeric/gaussian-cells.ts';

const QUIET = readoutResponse({ noiseElectrons: 0, efficiency: 1, maxElectrons: 5 });
const NOISY = readoutResponse({ noiseElectrons: 0.3, efficiency: 1, maxElectrons: 5 });
const HALF = readoutResponse({ noiseElectrons: 0.3, efficiency: 0.5, maxElectrons: 5 });
const SENSOR = { electronsPerPixelPerDay: 1e-4, pixelMassKg: 0.35e-9, readoutIntervalDays: 1 };

describe('perBinBackground', () => {
  it('is taken as given, absent bins 0', () => {
    const rates = [
      { electrons: 2, ratePerKgYear: 5 },
      { electrons: 0, ratePerKgYear: 7 },
    ];
    expect([...perBinBackground(rates, 3)]).toEqual([7, 0, 5, 0]);
    expect([...perBinBackground([], 2)]).toEqual([0, 0, 0]);
  });

  it.each([
    [[{ electrons: 4, ratePerKgYear: 1 }], 'rates/0/electrons'],
    [[{ electrons: -1, ratePerKgYear: 1 }], 'rates/0/electrons'],
    [[{ electrons: 1.5, ratePerKgYear: 1 }], 'rates/0/electrons'],
    [
      [
        { electrons: 1, ratePerKgYear: 1 },
        { electrons: 1, ratePerKgYear: 2 },
      ],
      'rates/1/electrons',
    ],
    [[{ electrons: 1, ratePerKgYear: -1 }], 'rates/0/rate'],
  ])('%j is refused at %s', (rates, path) => {
    try {
      perBinBackground(rates, 3);
      expect.unreachable();
    } catch (error) {
      expect((error as DomainError).parameter.join('/')).toBe(path);
    }
  });
});

describe('flatBackground', () => {
  it('in a perfect detector is the rate in one energy per pair, and nothing in bin 0', () => {
    const bins = flatBackground(1000, stepIonization(1.12, 3.8), QUIET);
    expect(bins[0]).toBe(0);
    for (let n = 1; n <= 5; n++) expect(bins[n]).toBeCloseTo(3.8, 12);
  });

  it('noise moves it across the last bin both ways: the far bins stay flat, also the last', () => {
    const bins = flatBackground(1000, stepIonization(1.12, 3.8), NOISY);
    const up = normalBetween(0.5 / 0.3, 1.5 / 0.3);
    expect(bins[5]).toBeCloseTo(3.8, 7); // to 1e-9 of the rate per electron, and the truncated neighbours
    expect(bins[0]).toBeCloseTo(3.8 * (normalBetween(-Infinity, -0.5 / 0.3) + normalBetween(-Infinity, -1.5 / 0.3)), 7);
    expect(bins[1]).toBeCloseTo(3.8 * (1 - up), 5); // nothing comes from k = 0
  });

  it('noise, Fano factor → 0 give the step model without noise', () => {
    const perfect = flatBackground(1000, stepIonization(1.12, 3.8), QUIET);
    const nearly = readoutResponse({ noiseElectrons: 0.01, efficiency: 1, maxElectrons: 5 });
    expect(flatBackground(1000, fanoIonization(1.12, 3.8, 0), nearly)).toEqual(perfect);
  });

  it('is multiplied by the efficiency', () => {
    const model = fanoIonization(1.12, 3.8, 0.12);
    expect([...flatBackground(1000, model, HALF)]).toEqual([...flatBackground(1000, model, NOISY)].map((r) => r / 2));
  });
});

describe('darkCurrentBackground', () => {
  it('at zero current the noise still makes empty pixels look charged', () => {
    const bins = darkCurrentBackground({ ...SENSOR, electronsPerPixelPerDay: 0 }, NOISY);
    const readings = 365.25 / 0.35e-9;
    expect(bins[0] / readings).toBeCloseTo(normalBetween(-Infinity, 0.5 / 0.3), 13);
    expect(bins[1] / (readings * normalBetween(0.5 / 0.3, 1.5 / 0.3))).toBeCloseTo(1, 13);
    expect([...darkCurrentBackground({ ...SENSOR, electronsPerPixelPerDay: 0 }, QUIET).subarray(1)]).toEqual([
      0, 0, 0, 0, 0,
    ]);
  });

  it('without noise is the pile-up; two electrons: λ²/2 e^{−λ} of the readings', () => {
    const bins = darkCurrentBackground(SENSOR, QUIET);
    expect(bins[2] / ((365.25 / 0.35e-9) * 0.5e-8 * Math.exp(-1e-4))).toBeCloseTo(1, 13);
  });

  it('is multiplied by the efficiency', () => {
    expect([...darkCurrentBackground(SENSOR, HALF)]).toEqual(
      [...darkCurrentBackground(SENSOR, NOISY)].map((r) => r / 2),
    );
  });
});
