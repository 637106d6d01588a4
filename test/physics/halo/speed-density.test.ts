import { describe, expect, it } from 'vitest';
import { componentsHalo } from '../../../physics/halo/components.ts';
import { speedDensity } from '../../../physics/halo/speed-density.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { tabulatedLaboratoryHalo } from '../../../physics/halo/tabulated.ts';

const halo = standardHalo({
  circularSpeedKmPerS: 238,
  escapeSpeedKmPerS: 544,
  laboratorySpeedKmPerS: 250,
  cutoff: 'sharp',
});

describe('speedDensity: F(v) = −v dη/dv', () => {
  it('is v [g(v − v_E) − g(v + v_E)]/(√π N v₀ v_E), g = exp(−s²/v₀²) cut at the escape speed, for the standard halo', () => {
    const [z, y] = [544 / 238, 250 / 238];
    const edge = Math.exp(-z * z);
    const g = (s: number): number => (Math.abs(s) < z ? Math.exp(-s * s) : edge);
    // N by its definition, ∫ over the sphere: erf z − (2/√π) z e^{−z²}, here by the trapezoid rule of ∫ 4 s² e^{−s²}/√π ds
    const steps = 200_000;
    let n = 0;
    for (let i = 0; i < steps; i++) {
      const s = (z * (i + 0.5)) / steps;
      n += ((4 / Math.sqrt(Math.PI)) * s * s * Math.exp(-s * s) * z) / steps;
    }
    let compared = 0;
    for (const v of [0.01, 1, 100, 250, 293.99, 294, 294.01, 350, 500, 700, 793.9]) {
      const x = v / 238;
      const expected = (x * (g(x - y) - g(x + y))) / (Math.sqrt(Math.PI) * n * y * 238);
      expect(Math.abs(speedDensity(halo, v) - expected), `${v}`).toBeLessThan(3e-3 * 1e-7);
      compared++;
    }
    expect(compared).toBe(11);
    for (const v of [0, 794, 1000]) expect(speedDensity(halo, v)).toBe(0);
  });

  it('gives back the straight lines of a tabulated F, on its points and between', () => {
    const table = { speedsKmPerS: [100, 200, 400], values: [0.001, 0.007, 0.001] };
    const tabulated = tabulatedLaboratoryHalo(table);
    expect(tabulated.normalisation).toBeCloseTo(1.2, 12);
    for (const [v, f] of [
      [50, 0],
      [100, 0.001],
      [150, 0.004],
      [200, 0.007],
      [300, 0.004],
      [399, 0.00103],
    ])
      expect(speedDensity(tabulated, v)).toBeCloseTo(f / 1.2, 9);
  });

  it('leaves out the spike of a cold stream, and refuses a negative speed', () => {
    const stream = { dispersionKmPerS: 0, meanVelocityKmPerS: [0, -100, 0] as const, escapeSpeedKmPerS: 544 };
    const rest = { dispersionKmPerS: 168, meanVelocityKmPerS: [0, 0, 0] as const, escapeSpeedKmPerS: 544 };
    const laboratory = [0, 250, 0] as const;
    const both = componentsHalo(
      [
        { weight: 3, ...rest },
        { weight: 1, ...stream },
      ],
      laboratory,
    );
    const alone = componentsHalo([{ weight: 1, ...rest }], laboratory);
    for (const v of [200, 349.99, 350, 350.01, 400])
      expect(speedDensity(both, v) / speedDensity(alone, v)).toBeCloseTo(0.75, 6);
    expect(() => speedDensity(halo, -1)).toThrow(/speed/);
  });
});
