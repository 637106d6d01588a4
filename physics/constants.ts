/**
 * Physical constants, each with its unit and source. CODATA 2022 recommended values (Mohr, Newell, Taylor & Tiesinga,
 * Rev. Mod. Phys. 97, 025002 (2025)); exact ones by definition of the SI. Derived values are computed, never typed.
 */

/** The release the measured constants below come from; part of every answer's provenance. */
export const CODATA_YEAR = 2022;

/** Speed of light, km/s. Exact (SI). */
export const SPEED_OF_LIGHT_KM_PER_S = 299_792.458;

/** Elementary charge, C: one electronvolt in joules. Exact (SI 2019). */
export const ELECTRONVOLT_J = 1.602_176_634e-19;

/** Planck constant, J s. Exact (SI 2019). */
const PLANCK_J_S = 6.626_070_15e-34;

/** Fine-structure constant α, dimensionless. CODATA 2022, uncertainty 1.1e-12. */
export const FINE_STRUCTURE = 7.297_352_564_3e-3;

/** Electron mass mₑc², eV. CODATA 2022, uncertainty 0.00016 eV. */
export const ELECTRON_MASS_EV = 510_998.950_69;

/** Atomic mass constant m_u, kg. CODATA 2022, uncertainty 5.2e-37 kg. */
export const ATOMIC_MASS_KG = 1.660_539_068_92e-27;

/** Julian year, s: the year of every exposure here. By definition, 365.25 days of 86,400 s. */
export const YEAR_S = 365.25 * 86_400;

/** ħc, eV Å. Derived from exact constants. */
export const HBAR_C_EV_ANGSTROM =
  ((PLANCK_J_S / (2 * Math.PI)) * SPEED_OF_LIGHT_KM_PER_S * 1e3 * 1e10) / ELECTRONVOLT_J;

/** One kilogram as an energy, eV. Derived from exact constants. */
export const KILOGRAM_EV = (SPEED_OF_LIGHT_KM_PER_S * 1e3) ** 2 / ELECTRONVOLT_J;

/** α mₑ, eV: the momentum at which σ̄ₑ is defined, and the inverse Bohr radius. */
export const REFERENCE_MOMENTUM_EV = FINE_STRUCTURE * ELECTRON_MASS_EV;
