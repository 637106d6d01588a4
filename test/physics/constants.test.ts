import { describe, expect, it } from 'vitest';
import * as constants from '../../physics/constants.ts';

/** Quantities that CODATA 2022 lists of their own (physics.nist.gov/constants; from memory), here from the constants we use. */
const LISTED = [
  {
    name: 'Bohr radius, Å',
    value: constants.HBAR_C_EV_ANGSTROM / constants.REFERENCE_MOMENTUM_EV,
    listed: 0.529177210544,
  },
  {
    name: 'Rydberg energy, eV',
    value: (constants.FINE_STRUCTURE ** 2 * constants.ELECTRON_MASS_EV) / 2,
    listed: 13.60569312299,
  },
  {
    name: 'Hartree energy, eV',
    value: constants.FINE_STRUCTURE ** 2 * constants.ELECTRON_MASS_EV,
    listed: 27.211386245981,
  },
  {
    name: 'Compton wavelength, 1e-12 m',
    value: (2 * Math.PI * constants.HBAR_C_EV_ANGSTROM * 100) / constants.ELECTRON_MASS_EV,
    listed: 2.42631023538,
  },
  { name: 'ħc, eV Å', value: constants.HBAR_C_EV_ANGSTROM, listed: 1973.269804593 },
  {
    name: 'atomic mass constant, MeV',
    value: (constants.ATOMIC_MASS_KG * constants.KILOGRAM_EV) / 1e6,
    listed: 931.49410372,
  },
  {
    name: 'electron mass, u',
    value: constants.ELECTRON_MASS_EV / (constants.ATOMIC_MASS_KG * constants.KILOGRAM_EV),
    listed: 5.485799090441e-4,
  },
];

describe('constants', () => {
  it.each(LISTED)('reproduce the separately listed $name', ({ value, listed }) => {
    expect(Math.abs(value / listed - 1)).toBeLessThan(2e-9); // the 3e-10 of the two masses, with room
  });

  it('agree with the 2018 release to the digits used', () => {
    expect(constants.FINE_STRUCTURE / 7.2973525693e-3).toBeCloseTo(1, 8); // they differ by 7e-10
    expect(constants.ELECTRON_MASS_EV / 510_998.95).toBeCloseTo(1, 8); // by 1.4e-9
    expect(constants.YEAR_S).toBe(31_557_600); // Julian year, exact
  });
});
