import { describe, expect, it } from 'vitest';
import { REFERENCE_MOMENTUM_EV as q0 } from '../../../physics/constants.ts';
import { mediatorFormFactorSquared } from '../../../physics/mediator/mediator.ts';

describe('mediatorFormFactorSquared', () => {
  it('is 1 at the reference momentum α mₑ for every mediator', () => {
    for (const mediator of [{ kind: 'heavy' }, { kind: 'light' }, { kind: 'massive', massEv: 3e4 }] as const) {
      expect(mediatorFormFactorSquared(mediator)(q0)).toBeCloseTo(1, 14);
    }
  });

  it('falls like q⁻⁴ for a light one, and goes over from heavy to light with the mass', () => {
    expect(mediatorFormFactorSquared({ kind: 'light' })(2 * q0)).toBeCloseTo(1 / 16, 14);
    expect(mediatorFormFactorSquared({ kind: 'massive', massEv: 1e300 })(2 * q0)).toBeCloseTo(1, 14);
    expect(mediatorFormFactorSquared({ kind: 'massive', massEv: 1e-300 })(2 * q0)).toBeCloseTo(1 / 16, 14);
    // F = (m² + q₀²)/(m² + q²) with m = q₀, q = 3 q₀: 2/10
    expect(mediatorFormFactorSquared({ kind: 'massive', massEv: q0 })(3 * q0)).toBeCloseTo(0.04, 14);
  });

  it('refuses a mass that is not above 0', () => {
    expect(() => mediatorFormFactorSquared({ kind: 'massive', massEv: 0 })).toThrow(/mediator mass/);
  });
});
