/**
 * Kinematics of a particle χ that scatters off a bound electron, giving momentum q and energy E to the crystal and, if its
 * ground state is split by δ, changing its own mass (Essig, Mardon & Volansky, PRD 85, 076007 (2012); δ > 0 up-, δ < 0
 * down-scattering).
 *
 *   v_min(q, E) = |(E + δ)/q + q/(2 m_χ)|                speeds in units of c; masses, energies, momenta in eV
 */
import { ELECTRON_MASS_EV } from '../constants.ts';

/** Reduced mass of χ and the electron, eV. */
export function reducedMassEv(massEv: number): number {
  return massEv / (1 + massEv / ELECTRON_MASS_EV);
}

/** Largest energy the crystal can receive, eV: E_max = ½ m_χ v_max² − δ. */
export function largestEnergyEv(massEv: number, splittingEv: number, largestSpeed: number): number {
  return 0.5 * massEv * largestSpeed * largestSpeed - splittingEv;
}

/** Smallest mass, eV, that can give the crystal an energy E: 2 (E + δ)/v_max². */
export function smallestMassEv(energyEv: number, splittingEv: number, largestSpeed: number): number {
  return (2 * (energyEv + splittingEv)) / (largestSpeed * largestSpeed);
}

/**
 * Momentum transfers, eV, at which energy E can be given: m_χ |v ∓ √(v² − 2(E + δ)/m_χ)| at v = v_max, or undefined where
 * no particle is fast enough. For E + δ ≥ 0; the lower end is written without cancellation.
 */
export function momentumRangeEv(
  massEv: number,
  energyPlusSplittingEv: number,
  largestSpeed: number,
): { readonly fromEv: number; readonly toEv: number } | undefined {
  const discriminant = largestSpeed * largestSpeed - (2 * energyPlusSplittingEv) / massEv;
  if (!(discriminant > 0)) return undefined;
  const sum = largestSpeed + Math.sqrt(discriminant);
  return { fromEv: (2 * energyPlusSplittingEv) / sum, toEv: massEv * sum };
}
