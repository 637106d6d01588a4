import { describe, expect, it } from 'vitest';
import { normalAbove, normalBelow } from '../../../physics/exposure/normal.ts';

describe('normalAbove', () => {
  // Abramowitz & Stegun, table 26.5 (and its continuation, 10 digits).
  it.each([
    { tail: 0.5, z: 0 },
    { tail: 0.1, z: 1.2815515655 },
    { tail: 0.05, z: 1.644853627 },
    { tail: 0.025, z: 1.9599639845 },
    { tail: 0.9, z: -1.2815515655 },
  ])('of $tail is $z (Abramowitz & Stegun)', ({ tail, z }) => {
    expect(Math.abs(normalAbove(tail) - z)).toBeLessThan(1e-9);
  });

  it('is undone by normalBelow, to 1e-14 in z', () => {
    for (let z = -8; z <= 8; z += 0.37) {
      const back = -normalAbove(normalBelow(z));
      // Above z = 0 the tail 1 − Φ is formed from Φ, whose rounding is 1e-16/φ(z) in z.
      const rounding = z > 0 ? 2e-16 / Math.exp(-(z * z) / 2) : 0;
      expect(Math.abs(back - z)).toBeLessThan(1e-14 + 3 * rounding);
    }
  });

  it('reaches far tails', () => {
    expect(normalBelow(-normalAbove(1e-200)) / 1e-200).toBeCloseTo(1, 10);
  });
});
