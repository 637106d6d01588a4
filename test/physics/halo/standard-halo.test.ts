import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { type Cutoff, standardHalo } from '../../../physics/halo/standard-halo.ts';
import reference from '../../fixtures/mean-inverse-speed.json' with { type: 'json' };

const halo = (v0: number, vE: number, vEsc: number, cutoff: Cutoff = 'sharp') =>
  standardHalo({ circularSpeedKmPerS: v0, laboratorySpeedKmPerS: vE, escapeSpeedKmPerS: vEsc, cutoff });

describe('standardHalo: η(v_min) against direct integration of the velocity distribution with 60 digits (fixtures/recipe)', () => {
  for (const set of reference.sets) {
    const { circularSpeed: v0, laboratorySpeed: vE, escapeSpeed: vEsc } = set;
    it(`v₀ ${v0}, v_E ${vE}, v_esc ${vEsc} km/s, ${set.cutoff}: 1e-9 up to 0.998 v_max, 1e-6 beyond`, () => {
      const { meanInverseSpeed, largestSpeedKmPerS: vMax } = halo(v0, vE, vEsc, set.cutoff as Cutoff);
      let compared = 0;
      for (const { speed, meanInverseSpeed: expected } of set.values) {
        const eta = Number(expected);
        if (eta === 0) expect(meanInverseSpeed(speed), `v_min ${speed}`).toBe(0);
        else {
          const tolerance = speed <= 0.998 * vMax ? 1e-9 : 1e-6;
          expect(
            Math.abs(meanInverseSpeed(speed) / eta - 1),
            `v_min ${speed}: ${meanInverseSpeed(speed)}, expected ${expected}`,
          ).toBeLessThan(tolerance);
        }
        compared++;
      }
      expect(compared).toBeGreaterThanOrEqual(20);
    });
  }
});

describe('standardHalo: published values and limits', () => {
  it('gives the values of 40-digit quadrature for (238, 250, 544) km/s (project physics notes)', () => {
    const table = [
      { v: 0, sharp: 3.4773991113e-3, smooth: 3.5246012457e-3 },
      { v: 294, sharp: 1.5834403581e-3, smooth: 1.5744331451e-3 },
      { v: 600, sharp: 6.3707260987e-5, smooth: 4.9638512405e-5 },
      { v: 780, sharp: 1.0589750218e-7, smooth: 9.652112583e-9 },
    ];
    for (const { v, sharp, smooth } of table) {
      expect(halo(238, 250, 544).meanInverseSpeed(v) / sharp).toBeCloseTo(1, 9);
      expect(halo(238, 250, 544, 'smooth').meanInverseSpeed(v) / smooth).toBeCloseTo(1, 9);
    }
  });

  it('tends to [erf(x+y) − erf(x−y)]/(2 v_E) for v_esc → ∞ (Lewin & Smith 1996), here by series of the error function', () => {
    // erf from the Maclaurin series, DLMF 7.6.1: another method than the code's
    const erf = (x: number): number => {
      let sum = 0;
      let term = x;
      for (let n = 0; n < 200; n++) {
        sum += term / (2 * n + 1);
        term *= -(x * x) / (n + 1);
      }
      return (2 / Math.sqrt(Math.PI)) * sum;
    };
    for (const v of [0, 50, 200, 400]) {
      const expected = (erf(v / 238 + 250 / 238) - erf(v / 238 - 250 / 238)) / 500;
      expect(halo(238, 250, 50_000).meanInverseSpeed(v) / expected).toBeCloseTo(1, 12);
    }
  });

  it('tends to 2(e^{−x²} − e^{−z²})/(√π v₀ N) for v_E → 0, and to 2/(√π v₀) at v_min = 0 in both limits', () => {
    const z = 544 / 238;
    const x = 300 / 238;
    const atRest = halo(238, 0, 544);
    const norm = 2 / Math.sqrt(Math.PI) / 238 / (1 - Math.exp(-z * z));
    const ratio = atRest.meanInverseSpeed(300) / atRest.meanInverseSpeed(0);
    expect(ratio).toBeCloseTo((Math.exp(-x * x) - Math.exp(-z * z)) / (1 - Math.exp(-z * z)), 13);
    for (const vE of [1e-12, 1e-6, 1e-3])
      expect(halo(238, vE, 544).meanInverseSpeed(300) / atRest.meanInverseSpeed(300)).toBeCloseTo(1, 9);
    expect(halo(238, 0, 1e4).meanInverseSpeed(0) / (2 / (Math.sqrt(Math.PI) * 238))).toBeCloseTo(1, 13);
    expect(norm).toBeGreaterThan(0);
  });

  it('is 1/v_E below v_E − v_esc: every particle is that fast', () => {
    for (const cutoff of ['sharp', 'smooth'] as const) {
      for (const v of [0, 100, 150]) expect(halo(238, 700, 544, cutoff).meanInverseSpeed(v) * 700).toBeCloseTo(1, 12);
    }
  });

  it('falls with v_min, is finite and at least 0, and exactly 0 from v_max on, for every v_E ≥ 0 and v_esc', () => {
    const speed = fc.double({ min: 1e-3, max: 3000, noNaN: true });
    const property = fc.property(
      speed,
      speed,
      fc.oneof(fc.constant(0), speed),
      fc.constantFrom('sharp', 'smooth'),
      (v0, vEsc, vE, cutoff) => {
        const h = halo(v0, vE, vEsc, cutoff as Cutoff);
        let above = 0;
        for (let i = 64; i >= 0; i--) {
          const eta = h.meanInverseSpeed((h.largestSpeedKmPerS * i) / 64);
          expect(Number.isFinite(eta)).toBe(true);
          expect(eta).toBeGreaterThanOrEqual(above * (1 - 1e-12));
          above = eta;
        }
        expect(h.meanInverseSpeed(h.largestSpeedKmPerS)).toBe(0);
        expect(h.meanInverseSpeed(h.largestSpeedKmPerS * 2)).toBe(0);
      },
    );
    fc.assert(property, { numRuns: 300 });
  });

  it('refuses speeds outside their domain, naming the parameter', () => {
    const cases = [
      { parameter: 'circularSpeed', of: () => halo(0, 250, 544) },
      { parameter: 'escapeSpeed', of: () => halo(238, 250, -1) },
      { parameter: 'laboratorySpeed', of: () => halo(238, Number.NaN, 544) },
      { parameter: 'laboratorySpeed', of: () => halo(238, 3e5, 544) },
    ];
    for (const { parameter, of } of cases) expect(of).toThrowError(expect.objectContaining({ parameter: [parameter] }));
    expect(() => halo(0, 1, 1)).toThrow(DomainError);
  });
});
