import { describe, expect, it } from 'vitest';
import {
  largestEnergyEv,
  momentumRangeEv,
  reducedMassEv,
  smallestMassEv,
} from '../../../physics/kinematics/kinematics.ts';

const V = 794 / 299_792.458;

describe('kinematics', () => {
  it('reducedMassEv: half the mass of equals, the lighter of two unequal ones', () => {
    expect(reducedMassEv(510_998.95069)).toBeCloseTo(510_998.95069 / 2, 6);
    expect(reducedMassEv(1e30) / 510_998.95069).toBeCloseTo(1, 12);
    expect(reducedMassEv(1e-6) / 1e-6).toBeCloseTo(1, 9);
  });

  it('momentumRangeEv: both ends satisfy v_min = v_max, the lower one without cancellation', () => {
    for (const [mass, energy] of [
      [1e7, 1.12],
      [1e7, 30],
      [1e12, 1e-3],
      [5e5, 1.5],
    ] as const) {
      const range = momentumRangeEv(mass, energy, V);
      expect(range).toBeDefined();
      for (const q of [range!.fromEv, range!.toEv]) expect((energy / q + q / (2 * mass)) / V).toBeCloseTo(1, 13);
    }
    expect(momentumRangeEv(1e7, 40, V)).toBeUndefined(); // above E_max = 35.07 eV
  });

  it('largestEnergyEv and smallestMassEv are inverse to each other, with a splitting of either sign', () => {
    for (const delta of [0, 0.5, -0.8]) {
      const mass = smallestMassEv(1.12, delta, V);
      expect(largestEnergyEv(mass, delta, V)).toBeCloseTo(1.12, 12);
    }
    expect(largestEnergyEv(1e7, 0, V)).toBeCloseTo(35.07, 2); // ½ · 10 MeV · (794 km/s)²
  });
});
