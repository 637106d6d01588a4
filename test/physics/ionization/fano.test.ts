import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { fanoIonization } from '../../../physics/ionization/fano.ts';
import type { IonizationModel } from '../../../physics/ionization/ionization-model.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';

const GAP = 1.12;
const PAIR = 3.8;
const BINS = 10;
const TOP = 48.7;

function weights(model: IonizationModel, energyEv: number, count = 400): Float64Array {
  const out = new Float64Array(count);
  model.probabilities(energyEv, out);
  return out;
}

const sum = (values: ArrayLike<number>): number => Array.from(values).reduce((a, b) => a + b, 0);

/** ∫ exp(−E/scale) dE from a to b. */
const decay =
  (scaleEv: number) =>
  (a: number, b: number): number =>
    -scaleEv * Math.exp(-a / scaleEv) * Math.expm1((a - b) / scaleEv);

/** Bin rates with the exact rate of every segment times the weight at its middle, as the rate core does. */
function midpointRates(model: IonizationModel, cutsEv: readonly number[], rate: (a: number, b: number) => number) {
  const rates = new Float64Array(BINS);
  const out = new Float64Array(BINS);
  for (let s = 1; s < cutsEv.length; s++) {
    model.probabilities((cutsEv[s - 1] + cutsEv[s]) / 2, out);
    const here = rate(cutsEv[s - 1], cutsEv[s]);
    for (let n = 0; n < BINS; n++) rates[n] += out[n] * here;
  }
  return rates;
}

/** The model's own segments together with a table axis of 0.1 eV steps that starts off the gap. */
function modelCuts(model: IonizationModel, gap: number): number[] {
  const axis = Array.from({ length: 600 }, (_, i) => i * 0.1).filter((e) => e > gap && e < TOP);
  return [gap, ...axis, ...model.breaksEv(gap, TOP), TOP].sort((a, b) => a - b);
}

/** A uniform grid much finer than any edge, cut at the multiples of the gap. */
function denseCuts(gap: number, stepEv: number): number[] {
  const cuts: number[] = [gap];
  for (let k = 2; gap > 0 && k * gap < TOP; k++) cuts.push(k * gap);
  cuts.push(TOP);
  return cuts.flatMap((end, i) => {
    if (i === 0) return [end];
    const pieces = Math.ceil((end - cuts[i - 1]) / stepEv);
    return Array.from({ length: pieces }, (_, p) => cuts[i - 1] + ((end - cuts[i - 1]) * (p + 1)) / pieces);
  });
}

function largestDifference(rates: Float64Array, expected: Float64Array): number {
  return Math.max(...rates.map((rate, n) => Math.abs(rate / expected[n] - 1)));
}

describe('fanoIonization: P(n|E)', () => {
  it('is the normalised cell of a normal distribution', () => {
    // the definition at 40 digits, cells by quadrature, with a general-purpose multiprecision library
    const cases: readonly (readonly [number, number, number, number, readonly number[]])[] = [
      [2, 1.12, 3.8, 0.12, [1, 0]],
      [5, 1.12, 3.8, 0.12, [0.4759336413327209, 0.513002334060675, 0.011062198748304422, 1.8258582996691287e-6, 0]],
      [11, 1.12, 3.8, 0.12, [0.004344037914100812, 0.15826950203208753, 0.5814157814750879, 0.24511518924707118]],
      [11, 0.67, 2.9, 0.13, [0.00021070699677572588, 0.015582803003990899, 0.20382783089892914, 0.5070055564394149]],
      [7, 3, 3.1, 1, [0.46138552919785253, 0.5386144708021474, 0]],
    ];
    for (const [energy, gap, pair, fano, expected] of cases) {
      const out = weights(fanoIonization(gap, pair, fano), energy);
      expected.forEach((p, n) => {
        expect(Math.abs(out[n] - p)).toBeLessThanOrEqual(1e-13 * p);
      });
    }
    expect(cases.length).toBe(5);
  });

  it('adds up to 1 above the gap, lies in 0…1 and ends at floor(E/gap)', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.01, max: 5, noNaN: true }),
        fc.double({ min: 1, max: 5, noNaN: true }),
        fc.double({ min: 0, max: 10, noNaN: true }),
        fc.double({ min: 0, max: 60, noNaN: true }),
        (gap, ratio, fano, above) => {
          const energy = gap * (1 + above / 10);
          const out = weights(fanoIonization(gap, gap * ratio, fano), energy);
          expect(sum(out)).toBeCloseTo(1, 13);
          expect(out.every((p) => p >= 0 && p <= 1 + 1e-15)).toBe(true);
          expect(out.subarray(Math.floor(energy / gap)).every((p) => p === 0)).toBe(true);
        },
      ),
      { numRuns: 500, seed: 1 },
    );
  });

  it('is zero below the gap and one electron at it', () => {
    const model = fanoIonization(GAP, PAIR, 0.12);
    expect(sum(weights(model, 1.1199))).toBe(0);
    expect(weights(model, GAP)[0]).toBe(1);
  });

  it('has mean N̄ and variance F N̄ + 1/12 where the ends do not bite', () => {
    // The rounding's own mean and 1/12 hold to 4 exp(−2π² F N̄) (Poisson summation), below 1e-9 for F N̄ > 1.2.
    let compared = 0;
    for (const fano of [0.12, 0.2]) {
      for (let energy = 50; energy < 120; energy += 1.7) {
        const out = weights(fanoIonization(GAP, PAIR, fano), energy);
        const mean = out.reduce((total, p, i) => total + p * (i + 1), 0);
        const variance = out.reduce((total, p, i) => total + p * (i + 1 - mean) ** 2, 0);
        const expected = 0.5 + (energy - GAP) / PAIR;
        expect(Math.abs(mean - expected)).toBeLessThan(1e-9);
        expect(Math.abs(variance - (fano * expected + 1 / 12))).toBeLessThan(1e-8);
        compared++;
      }
    }
    expect(compared).toBe(84);
  });

  it('without a gap has no upper end', () => {
    expect(weights(fanoIonization(0, 3, 1), 3)[9]).toBeGreaterThan(0);
    expect(fanoIonization(0, 3, 1).breaksEv(0, 30)).not.toContain(0);
  });
});

describe('fanoIonization: F → 0', () => {
  it('F = 0 is the step model, weights and breaks', () => {
    const [model, step] = [fanoIonization(GAP, PAIR, 0), stepIonization(GAP, PAIR)];
    expect(model.breaksEv(0, TOP)).toEqual(step.breaksEv(0, TOP));
    expect(model.maxSegmentEv).toBe(Infinity);
    for (let energy = 0; energy < TOP; energy += 0.01)
      expect(weights(model, energy, 15)).toEqual(weights(step, energy, 15));
  });

  it('away from the edges a tiny F is the step model exactly', () => {
    for (const fano of [1e-300, 1e-31, 1e-29, 1e-12]) {
      const [model, step] = [fanoIonization(GAP, PAIR, fano), stepIonization(GAP, PAIR)];
      for (let x = 0.005; x < 12; x += 0.01) {
        const energy = GAP + x * PAIR;
        expect(weights(model, energy, 15)).toEqual(weights(step, energy, 15));
      }
    }
  });

  it('bin rates approach those of the step model in proportion to F', () => {
    const rate = decay(10);
    const step = stepIonization(GAP, PAIR);
    const limit = midpointRates(step, modelCuts(step, GAP), rate);
    for (const fano of [1e-29, 1e-12, 1e-6, 1e-4, 1e-3]) {
      const model = fanoIonization(GAP, PAIR, fano);
      const difference = largestDifference(midpointRates(model, modelCuts(model, GAP), rate), limit);
      expect(difference).toBeLessThan(2 * fano + 1e-12);
      if (fano >= 1e-6) expect(difference).toBeGreaterThan(0.2 * fano);
    }
  });
});

describe('fanoIonization: segments', () => {
  it.each([1e-6, 1e-4, 1e-3, 2.5e-3, 2.7e-3, 0.01, 0.12, 1, 10])(
    'F = %f: bin rates of a falling spectrum within 2e-5 of a dense sum',
    (fano) => {
      const dense = denseCuts(GAP, Math.min(0.004, (PAIR * Math.sqrt(fano)) / 10));
      const model = fanoIonization(GAP, PAIR, fano);
      for (const scaleEv of [PAIR, 10]) {
        const expected = midpointRates(model, dense, decay(scaleEv));
        const difference = largestDifference(midpointRates(model, modelCuts(model, GAP), decay(scaleEv)), expected);
        expect(difference).toBeLessThan(2e-5);
      }
    },
  );

  it.each([
    [3.8, 3.8, 0.12],
    [3.8, 3.8, 1e-4],
    [0.05, 3, 0.2],
    [0, 3, 0.2],
    [1.9, 2, 2],
  ])('gap %f, energy per pair %f, F = %f: the same', (gap, pair, fano) => {
    const model = fanoIonization(gap, pair, fano);
    const dense = denseCuts(gap, 0.002);
    const expected = midpointRates(model, dense, decay(5));
    const difference = largestDifference(midpointRates(model, modelCuts(model, gap), decay(5)), expected);
    expect(difference).toBeLessThan(2e-5);
  });

  it('breaks ascend strictly inside the limits, at most 65 to an energy per pair besides the multiples of the gap', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0, max: 3, noNaN: true }),
        fc.double({ min: 1, max: 4, noNaN: true }),
        fc.double({ min: -30, max: 1, noNaN: true }),
        fc.double({ min: 0, max: 20, noNaN: true }),
        (gap, ratio, logFano, from) => {
          const pair = Math.max(1, gap * ratio);
          const to = from + 30;
          const breaks = fanoIonization(gap, pair, 10 ** logFano).breaksEv(from, to);
          expect(breaks.every((e, i) => e > (breaks[i - 1] ?? from) && e < to)).toBe(true);
          expect(breaks.length).toBeLessThan(65 * (30 / pair + 2) + 30 / Math.max(gap, 0.03));
        },
      ),
      { numRuns: 300, seed: 2 },
    );
  });

  it('stays bounded for a gap next to nothing', () => {
    expect(fanoIonization(1e-12, 3, 0.1).breaksEv(0, 60).length).toBeLessThan(1500);
  });

  it('holds the multiples of the gap while they matter', () => {
    const breaks = fanoIonization(GAP, PAIR, 0.12).breaksEv(GAP, TOP);
    for (const k of [2, 3, 4]) expect(breaks).toContain(k * GAP);
  });

  it('reachEv: the probability of so few electrons is below 1e-12 there', () => {
    for (const fano of [0, 1e-6, 0.12, 1, 10]) {
      for (const electrons of [1, 5, 30]) {
        const model = fanoIonization(GAP, PAIR, fano);
        expect(sum(weights(model, model.reachEv(electrons), electrons))).toBeLessThan(1e-12);
        expect(sum(weights(model, model.reachEv(electrons) * 0.8, electrons))).toBeGreaterThan(1e-12);
      }
    }
  });
});

describe('fanoIonization: domain', () => {
  it.each([
    [-1, 3.8, 0.1, 'bandGap'],
    [Number.NaN, 3.8, 0.1, 'bandGap'],
    [1.12, 0, 0.1, 'energyPerPair'],
    [1.12, 1, 0.1, 'energyPerPair'],
    [1.12, 3.8, -0.1, 'fanoFactor'],
    [1.12, 3.8, Number.NaN, 'fanoFactor'],
    [1.12, 3.8, 10.1, 'fanoFactor'],
  ])('(%f, %f, %f) is refused at %s', (gap, pair, fano, path) => {
    try {
      fanoIonization(gap, pair, fano);
      expect.unreachable();
    } catch (error) {
      expect(error).toBeInstanceOf(DomainError);
      expect((error as DomainError).parameter).toEqual([path]);
    }
  });
});
