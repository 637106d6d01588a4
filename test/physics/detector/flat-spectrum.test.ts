import { describe, expect, it } from 'vitest';
import { flatSpectrumRates } from '../../../physics/detector/flat-spectrum.ts';
import { DomainError } from '../../../physics/errors.ts';
import { fanoIonization } from '../../../physics/ionization/fano.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import { tableIonization } from '../../../physics/ionization/table.ts';

/** ∫ P(n|E) dE on a uniform grid cut at the multiples of the gap, with Gauss's two nodes in every cell. */
function denseRates(gap: number, pair: number, fano: number, count: number): Float64Array {
  const model = fanoIonization(gap, pair, fano);
  const pieces = 200;
  const width = gap / pieces;
  const rates = new Float64Array(count + 1);
  const out = new Float64Array(count);
  for (let k = 1; k * gap < model.reachEv(count); k++) {
    for (let p = 0; p < pieces; p++) {
      for (const node of [-1, 1]) {
        model.probabilities(k * gap + (p + 0.5 + node / Math.sqrt(12)) * width, out);
        for (let n = 1; n <= count; n++) rates[n] += (out[n - 1] * width) / 2;
      }
    }
  }
  return rates;
}

describe('flatSpectrumRates', () => {
  it('step model: every bin gets the rate in one energy per pair', () => {
    const rates = flatSpectrumRates(1000, stepIonization(1.12, 3.8), 15);
    expect(rates[0]).toBe(0);
    for (let n = 1; n <= 15; n++) expect(rates[n]).toBeCloseTo(3.8, 12);
    expect(flatSpectrumRates(1000, fanoIonization(1.12, 3.8, 0), 15)).toEqual(rates);
  });

  it.each([
    [1.12, 3.8, 0.12],
    [0.67, 2.9, 0.13],
    [3, 3.1, 1],
    [1.12, 3.8, 0.003],
  ])('gap %f, energy per pair %f, F = %f: within 3e-6 of a dense quadrature', (gap, pair, fano) => {
    const rates = flatSpectrumRates(1000, fanoIonization(gap, pair, fano), 8);
    const expected = denseRates(gap, pair, fano, 8);
    for (let n = 1; n <= 8; n++) expect(Math.abs(rates[n] / expected[n] - 1)).toBeLessThan(3e-6);
  });

  it('Fano model: tends to the step model as F → 0', () => {
    for (const fano of [1e-12, 1e-6, 1e-4]) {
      const rates = flatSpectrumRates(1000, fanoIonization(1.12, 3.8, fano), 6);
      for (let n = 1; n <= 6; n++) expect(Math.abs(rates[n] / 3.8 - 1)).toBeLessThan(fano + 1e-12);
    }
  });

  it('table: the area under each column, from the gap to the end of the axis', () => {
    const model = tableIonization({
      energiesEv: [1, 3, 6],
      probabilities: [
        [1, 0],
        [0.5, 0.4],
        [0, 0],
      ],
      bandGapEv: 1,
    });
    const rates = flatSpectrumRates(2000, model, 4);
    [0, 2 * (1.5 + 0.75), 2 * (0.4 + 0.6), 0, 0].forEach((expected, n) => {
      expect(rates[n]).toBeCloseTo(expected, 12);
    });
  });

  it('table that ends below its gap: nothing', () => {
    const model = tableIonization({ energiesEv: [1, 2], probabilities: [[0], [0]], bandGapEv: 3 });
    expect([...flatSpectrumRates(1, model, 2)]).toEqual([0, 0, 0]);
  });

  it('divides by the widest segment a model allows', () => {
    const halves = { ...stepIonization(1, 2), maxSegmentEv: 0.3 };
    for (const rate of flatSpectrumRates(1000, halves, 3).subarray(1)) expect(rate).toBeCloseTo(2, 12);
  });

  it('refuses a negative rate', () => {
    expect(() => flatSpectrumRates(-1, stepIonization(1, 2), 3)).toThrow(DomainError);
  });
});
