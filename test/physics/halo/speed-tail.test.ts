import { describe, expect, it } from 'vitest';
import { componentsHalo } from '../../../physics/halo/components.ts';
import { meanSpeedKmPerS } from '../../../physics/halo/mean-speed.ts';
import { secondTailAt, speedTail, tailAt } from '../../../physics/halo/speed-tail.ts';
import { type Cutoff, standardHalo } from '../../../physics/halo/standard-halo.ts';
import { gaussLegendre } from '../../../physics/numeric/gauss-legendre.ts';
import reference from '../../fixtures/mean-inverse-speed.json' with { type: 'json' };

const haloOf = (set: (typeof reference.sets)[number]) =>
  standardHalo({
    circularSpeedKmPerS: set.circularSpeed,
    laboratorySpeedKmPerS: set.laboratorySpeed,
    escapeSpeedKmPerS: set.escapeSpeed,
    cutoff: set.cutoff as Cutoff,
  });

/** Halos a planner could mean; beyond them η falls by a hundred orders of magnitude within a cell or two. */
const ORDINARY = reference.sets.filter(
  (set) => set.circularSpeed >= 100 && set.escapeSpeed >= 100 && set.escapeSpeed <= 1000,
);
const RULE = gaussLegendre(20);

describe('speedTail: H(v) = ∫_v^∞ η dv′', () => {
  it('agrees with 60-digit quadrature (fixtures/recipe), is 1 at 0 and 0 from v_max on', () => {
    let compared = 0;
    for (const set of ORDINARY) {
      const halo = haloOf(set);
      const tail = speedTail(halo, 0);
      expect(tailAt(tail, 0)).toBeCloseTo(1, 9);
      expect(tailAt(tail, halo.largestSpeedKmPerS)).toBe(0);
      for (const value of set.values as { speed: number; tail?: string }[]) {
        if (value.tail === undefined || Number(value.tail) < 1e-20) continue;
        const expected = Number(value.tail);
        expect(
          Math.abs(tailAt(tail, value.speed) / expected - 1),
          `${JSON.stringify(set.laboratorySpeed)} ${value.speed}`,
        ).toBeLessThan(1e-6);
        compared++;
      }
    }
    expect(compared).toBeGreaterThan(100);
  });

  it('has differences over short stretches to 1e-7 and better, up to the edge, and H₂ as the integral of H', () => {
    for (const set of ORDINARY.filter(({ laboratorySpeed }) => laboratorySpeed === 250 || laboratorySpeed === 0)) {
      const halo = haloOf(set);
      for (const from of [0, 0.5, 0.99].map((share) => share * halo.largestSpeedKmPerS)) {
        const tail = speedTail(halo, from);
        for (const [a, b] of [
          [0.1, 0.11],
          [0.5, 0.53],
          [0.9, 0.95],
          [0.99, 0.999],
          [0.999, 0.9999],
        ]) {
          const [v1, v2] = [a, b].map((share) => from + share * (halo.largestSpeedKmPerS - from));
          const integral = (f: (v: number) => number): number =>
            RULE.nodes.reduce(
              (sum, x, i) => sum + (RULE.weights[i] * f((v1 + v2) / 2 + ((v2 - v1) / 2) * x) * (v2 - v1)) / 2,
              0,
            );
          const difference = tailAt(tail, v1) - tailAt(tail, v2);
          expect(Math.abs(difference / integral(halo.meanInverseSpeed) - 1), `${set.cutoff} ${v1}–${v2}`).toBeLessThan(
            1e-7,
          );
          const second = secondTailAt(tail, v1) - secondTailAt(tail, v2);
          expect(Math.abs(second / integral((v) => tailAt(tail, v)) - 1)).toBeLessThan(1e-7);
        }
      }
    }
  });
});

describe('speedTail of an η that jumps or falls steeply', () => {
  const laboratory = [11.1, 250.2, 7.3] as const;
  const stream = (dispersionKmPerS: number, v: number, weight = 1) => ({
    weight,
    dispersionKmPerS,
    meanVelocityKmPerS: [0, v, 0] as const,
    escapeSpeedKmPerS: 544,
  });
  const isotropic = { ...stream(168, 0), meanVelocityKmPerS: [0, 0, 0] as const };

  it('is the ramp 1 − v/v_s for one cold stream, and its half square, exactly', () => {
    const halo = componentsHalo([stream(0, -300)], laboratory);
    const vs = halo.largestSpeedKmPerS;
    for (const from of [0, 400]) {
      const tail = speedTail(halo, from);
      for (const v of [from, 430.1, 500, 0.9999 * vs]) {
        expect(tailAt(tail, v) / (1 - v / vs)).toBeCloseTo(1, 11);
        expect(secondTailAt(tail, v) / ((vs - v) ** 2 / (2 * vs))).toBeCloseTo(1, 9);
      }
    }
  });

  it('is the weighted sum of those of its parts: corners where two streams end, sections for a narrow one', () => {
    const parts = [isotropic, stream(0, -100, 0.2), stream(0, -200, 0.3), stream(1, -250, 0.1)];
    const total = 1.6;
    const whole = speedTail(componentsHalo(parts, laboratory), 0);
    const own = parts.map((part) => ({
      weight: part.weight / total,
      tail: speedTail(componentsHalo([part], laboratory), 0),
    }));
    let compared = 0;
    for (let v = 0; v < 780; v += 1.37) {
      const expected = own.reduce((sum, { weight, tail }) => sum + weight * tailAt(tail, v), 0);
      expect(Math.abs(tailAt(whole, v) / expected - 1), `${v}`).toBeLessThan(1e-7);
      compared++;
    }
    expect(compared).toBeGreaterThan(500);
    expect(tailAt(whole, 0)).toBeCloseTo(1, 9);
  });
});

describe('meanSpeedKmPerS', () => {
  it('is ⟨v⟩ = 353.731 km/s for (238, 250, 544) (project physics notes), and that of direct integration for every set', () => {
    for (const set of reference.sets) {
      expect(
        Math.abs(meanSpeedKmPerS(haloOf(set)) / Number(set.meanSpeed) - 1),
        `${JSON.stringify(set.laboratorySpeed)} ${set.escapeSpeed}`,
      ).toBeLessThan(1e-9);
    }
    const standard = standardHalo({
      circularSpeedKmPerS: 238,
      laboratorySpeedKmPerS: 250,
      escapeSpeedKmPerS: 544,
      cutoff: 'sharp',
    });
    expect(meanSpeedKmPerS(standard)).toBeCloseTo(353.731, 3);
  });
});
