/** Dielectric functions known in closed form, as tables. Numbers of formulas, for tests alone. */
import { ELECTRON_MASS_EV, FINE_STRUCTURE } from '../../physics/constants.ts';
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { cellVolumePerEv3, formFactorPerResponse } from '../../physics/crystal/crystal-table.ts';
import { rowFifthPowersEv5 } from '../../physics/crystal/fifth-power.ts';

export const CELL = { cellMassEv: 52.32e9, cellVolumeAngstrom3: 40 };

/** Electrons in 40 Å³ whose plasma energy is `plasmaEv`: ω_p² = 4π α N/(mₑ V). */
export function electronsOfPlasma(plasmaEv: number): number {
  return (plasmaEv ** 2 * ELECTRON_MASS_EV * cellVolumePerEv3(CELL)) / (4 * Math.PI * FINE_STRUCTURE);
}

/** Three momenta with the same response g(E) at each, as |f|² = V q⁵ g/(8π² α² mₑ²), with exact cell means of q⁵. */
export function formFactorOf(axes: 'edges' | 'points', energyEv: Float64Array, response: Float64Array): CrystalTable {
  const momentumEv = Float64Array.from(axes === 'edges' ? [0, 100, 250, 300] : [100, 250, 300]);
  const blank: CrystalTable = { axes, quantity: 'formFactorSquared', momentumEv, energyEv, values: response, ...CELL };
  const factor = formFactorPerResponse(CELL);
  const values = Float64Array.from(rowFifthPowersEv5(blank)).reduce<number[]>(
    (all, power) => all.concat(Array.from(response, (g) => factor * power * g)),
    [],
  );
  return { ...blank, values: Float64Array.from(values) };
}

/**
 * A damped oscillator, ε = 1 + ω_p²/(E₀² − E² − iγE) (Lorentz; for E₀ = 0 Drude's metal): Wooten, Optical Properties of Solids
 * (Academic Press 1972), chapter 3. Its loss function is that of an oscillator at √(E₀² + ω_p²).
 */
export function oscillator(plasmaEv: number, resonanceEv: number, dampingEv: number) {
  const shape = (e: number, resonance: number): { re: number; im: number } => {
    const [a, b] = [resonance ** 2 - e ** 2, dampingEv * e];
    return { re: (plasmaEv ** 2 * a) / (a * a + b * b), im: (plasmaEv ** 2 * b) / (a * a + b * b) };
  };
  const plasmon = Math.hypot(resonanceEv, plasmaEv);
  return {
    real: (e: number): number => 1 + shape(e, resonanceEv).re,
    imaginary: (e: number): number => shape(e, resonanceEv).im,
    loss: (e: number): number => shape(e, plasmon).im,
    plasmonEv: plasmon,
    /** 1/ε(0); 0 for a metal. */
    inverseStatic: resonanceEv ** 2 / plasmon ** 2,
  };
}

/** An axis that is fine at small energies: e = s (x + x²…), from 0 to topEv in `cells` steps of growing width. */
export function growingAxis(topEv: number, cells: number, growth: number): Float64Array {
  return Float64Array.from(
    { length: cells + 1 },
    (_, i) => (topEv * Math.expm1((growth * i) / cells)) / Math.expm1(growth),
  );
}
