/**
 * The mediator's form factor |F_DM(q)|², with F_DM = 1 at the reference momentum q = α mₑ (Essig, Mardon & Volansky, PRD 85,
 * 076007 (2012)).
 */
import { REFERENCE_MOMENTUM_EV } from '../constants.ts';
import { requirePositive } from '../errors.ts';

export type Mediator =
  | { readonly kind: 'heavy' } // F = 1
  | { readonly kind: 'light' } // F = (α mₑ/q)²
  | { readonly kind: 'massive'; readonly massEv: number }; // vector of mass m: F = (m² + α²mₑ²)/(m² + q²)

/** |F_DM|² as a function of the momentum transfer q > 0 in eV. Throws DomainError for a mass that is not above 0. */
export function mediatorFormFactorSquared(mediator: Mediator): (qEv: number) => number {
  switch (mediator.kind) {
    case 'heavy':
      return () => 1;
    case 'light':
      return (q) => (REFERENCE_MOMENTUM_EV / q) ** 4;
    case 'massive': {
      requirePositive('mediator mass', mediator.massEv);
      const m = mediator.massEv;
      // written with ratios so that no mass, however large or small, overflows
      return (q) => {
        const scale = Math.max(m, q);
        const numerator = (m / scale) ** 2 + (REFERENCE_MOMENTUM_EV / scale) ** 2;
        return (numerator / ((m / scale) ** 2 + (q / scale) ** 2)) ** 2;
      };
    }
  }
}
