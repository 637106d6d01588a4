import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { KINDS, parseQuantity, QuantityError, quantityOf } from '../../../physics/quantity/quantity.ts';

type KindName = keyof typeof KINDS;

/** Expected values from exact SI factors and CODATA 2022, worked out by hand. */
const READ: readonly [string, KindName, number][] = [
  ['10 MeV', 'mass', 10],
  ['10MeV', 'mass', 10],
  ['10 MeV/c^2', 'mass', 10],
  ['700 keV', 'mass', 0.7],
  ['1e5 eV', 'mass', 0.1],
  ['0.01 GeV', 'mass', 10],
  ['1 TeV/c^2', 'mass', 1e6],
  ['1.78266192e-26 g', 'mass', 10.0],
  ['1.78266192e-29 kg', 'mass', 10.0],
  ['0.4 GeV/cm^3', 'density', 0.4],
  ['0.4 GeV/c^2/cm^3', 'density', 0.4],
  ['400 MeV/cm^3', 'density', 0.4],
  ['5e-25 g/cm^3', 'density', 0.28047943],
  ['5e-22 kg/m^3', 'density', 0.28047943],
  ['1 kg yr', 'exposure', 1],
  ['1 kg*yr', 'exposure', 1],
  ['365.25 kg day', 'exposure', 1],
  ['100 g year', 'exposure', 0.1],
  ['1 tonne year', 'exposure', 1000],
  ['1e-37 cm^2', 'crossSection', 1e-37],
  ['1e-41 m^2', 'crossSection', 1e-37],
  ['2 barn', 'crossSection', 2e-24],
  ['1 pbarn', 'crossSection', 1e-36],
  ['3 keV', 'momentum', 3],
  ['3 keV/c', 'momentum', 3],
  ['0.003 MeV/c', 'momentum', 3],
  ['1 1/angstrom', 'momentum', 1.973269804],
  ['1/angstrom', 'momentum', 1.973269804],
  ['10 1/nm', 'momentum', 1.973269804],
  ['1 1/bohr', 'momentum', 3.7289395],
  ['250000 m/s', 'speed', 250],
  ['0.001 c', 'speed', 299.792458],
  ['40 angstrom^3', 'volume', 40],
  ['0.04 nm^3', 'volume', 40],
  ['  +1.12e0  eV ', 'energy', 1.12],
];

const REFUSED: readonly [string, KindName, RegExp][] = [
  ['10', 'mass', /no unit/],
  ['MeV', 'mass', /no number/],
  ['', 'mass', /no number/],
  ['10 kg', 'energy', /"kg" is not a unit of energy/],
  ['10 MeV', 'speed', /such as "238 km\/s"/],
  ['1 stick', 'cellMass', /unknown unit "stick"/],
  ['1 ton', 'cellMass', /unknown unit "ton"/],
  ['1 b', 'crossSection', /unknown unit "b"/],
  ['1e400 eV', 'energy', /not finite/],
  ['NaN eV', 'energy', /no number/],
  ['Infinity eV', 'energy', /no number/],
  ['10 5 MeV', 'mass', /not a unit/],
  ['10 MeV; 1', 'mass', /not a unit/],
  ['10 (((', 'mass', /not a unit/],
  ['0x10 MeV', 'mass', /unknown unit/],
  ['10 МeV', 'mass', /printable ASCII/], // a Cyrillic letter
  [`1${'0'.repeat(5000)} MeV`, 'mass', /longer than 64/],
  ['1 __proto__', 'mass', /unknown unit/],
  ['1 constructor', 'mass', /unknown unit/],
];

describe('parseQuantity', () => {
  it.each(READ)('"%s" is %s %d in its fixed unit', (text, kind, expected) => {
    expect(Math.abs(parseQuantity(text, KINDS[kind]) / expected - 1)).toBeLessThan(3e-8); // the digits of the hand values
  });

  it.each(REFUSED)('refuses "%s" for %s and says what would be right', (text, kind, message) => {
    expect(() => parseQuantity(text, KINDS[kind])).toThrow(QuantityError);
    expect(() => parseQuantity(text, KINDS[kind])).toThrow(message);
  });

  it('gives decimal numbers of decimal multiples exactly', () => {
    const exact = [
      ['0.3 GeV/cm^3', 'density', 0.3],
      ['700 keV', 'mass', 0.7],
      ['1100 meV', 'energy', 1.1],
      ['300 MeV/cm^3', 'density', 0.3],
    ] as const;
    for (const [text, kind, value] of exact) expect(parseQuantity(text, KINDS[kind])).toBe(value);
  });

  it('reads what it writes: number and fixed unit round-trip for every finite number', () => {
    const roundTrip = fc.property(
      fc.double({ noNaN: true, noDefaultInfinity: true }).filter((value) => !Object.is(value, -0)),
      fc.constantFrom(...(Object.keys(KINDS) as KindName[])),
      (value, kind) => {
        expect(quantityOf(value, KINDS[kind].unit, KINDS[kind])).toEqual(value);
        expect(parseQuantity(`${value} ${KINDS[kind].unit}`, KINDS[kind])).toEqual(value);
      },
    );
    fc.assert(roundTrip, { numRuns: 500 });
  });
});
