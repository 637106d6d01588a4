/**
 * Quantities by unit: "10 MeV", "0.3 GeV/cm^3", "1/(kg yr)". The one place where mathjs is loaded.
 *
 * A kind of quantity has one fixed unit in which the service works and answers, and a list of unit expressions through which
 * anything compatible may come in; natural units (ħ = c = 1) enter there: a mass may be an energy, a momentum an inverse length.
 */
import { createRequire } from 'node:module';
import type * as MathJs from 'mathjs';
import { ELECTRONVOLT_J, HBAR_C_EV_ANGSTROM, REFERENCE_MOMENTUM_EV, SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';

// the ES module entry of mathjs takes seconds to load, the bundle a tenth of one
const { create } = createRequire(import.meta.url)('mathjs/lib/browser/math.js') as typeof MathJs;
const math = create({}) as MathJs.MathJsInstance & {
  Unit: { UNITS: Record<string, { value: number }> };
  createUnit(units: Record<string, { definition: string; prefixes?: string; aliases?: string[] }>): void;
};
for (const name of ['eV', 'electronvolt']) math.Unit.UNITS[name].value = ELECTRONVOLT_J; // mathjs has CODATA 2010
math.createUnit({
  yr: { definition: '365.25 day' },
  d: { definition: '1 day' },
  barn: { definition: '1e-28 m^2', prefixes: 'short' },
  c: { definition: `${SPEED_OF_LIGHT_KM_PER_S} km/s` },
  bohr: { definition: `${HBAR_C_EV_ANGSTROM / REFERENCE_MOMENTUM_EV} angstrom` },
});

export interface QuantityKind {
  /** What an error calls it: "a mass". */
  readonly name: string;
  /** The fixed unit. */
  readonly unit: string;
  /** How a caller may write it. */
  readonly example: string;
  /** Unit expressions and how many fixed units each is worth; the first of the same dimension is taken. */
  readonly ways: readonly (readonly [string, number])[];
}

const kind = (name: string, unit: string, example: string, ...ways: (readonly [string, number])[]): QuantityKind => ({
  name,
  unit,
  example,
  ways: ways.length > 0 ? ways : [[unit, 1]],
});

/** Every kind of quantity the service takes. */
export const KINDS = {
  mass: kind('a mass', 'MeV', '10 MeV', ['MeV', 1], ['MeV/c^2', 1]),
  cellMass: kind('a mass', 'GeV', '52.32 GeV', ['GeV', 1], ['GeV/c^2', 1]),
  energy: kind('an energy', 'eV', '1.12 eV'),
  momentum: kind('a momentum', 'keV', '3.7 keV', ['keV', 1], ['keV/c', 1], ['angstrom^-1', HBAR_C_EV_ANGSTROM / 1e3]),
  mediatorMass: kind('a mass', 'keV', '30 keV', ['keV', 1], ['keV/c^2', 1]),
  crossSection: kind('a cross section', 'cm^2', '1e-37 cm^2'),
  density: kind('a mass density', 'GeV/cm^3', '0.3 GeV/cm^3', ['GeV/cm^3', 1], ['GeV/(c^2 cm^3)', 1]),
  speed: kind('a speed', 'km/s', '238 km/s'),
  volume: kind('a volume', 'angstrom^3', '40 angstrom^3'),
  exposure: kind('an exposure', 'kg yr', '1 kg yr'),
  rate: kind('a rate', '1/(kg yr)', '5 1/(kg yr)', ['kg^-1 yr^-1', 1]),
  spectralRate: kind('a rate per energy', '1/(kg yr keV)', '1000 1/(kg yr keV)', ['kg^-1 yr^-1 keV^-1', 1]),
  current: kind('a number per time', '1/day', '1e-4 1/day', ['day^-1', 1]),
  detectorMass: kind('a mass', 'kg', '0.35 ug'),
  duration: kind('a time', 'day', '1 day'),
} as const satisfies Record<string, QuantityKind>;

/** Unit names a quantity may use, SI prefixes written out: mathjs knows many more, some of them traps ("ton", "stick", "b"). */
const UNIT_NAMES = new Set([
  ...['', 'm', 'k', 'M', 'G', 'T'].map((prefix) => `${prefix}eV`),
  ...['', 'u', 'm', 'k'].map((prefix) => `${prefix}g`),
  ...['', 'f', 'p', 'n', 'u', 'm', 'c', 'k'].map((prefix) => `${prefix}m`),
  ...['', 'y', 'z', 'a', 'f', 'p', 'n', 'u', 'm'].map((prefix) => `${prefix}barn`),
  ...[
    's',
    'ms',
    'min',
    'minute',
    'minutes',
    'h',
    'hour',
    'hours',
    'd',
    'day',
    'days',
    'week',
    'weeks',
    'yr',
    'year',
    'years',
  ],
  ...['gram', 'grams', 'tonne', 'tonnes'],
  ...['c', 'angstrom', 'bohr'],
]);
const NUMBER = /^\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*\*?\s*(.*)$/s;
/** A unit begins with a name or a bracket, perhaps under a fraction; no second number. */
const UNIT_START = /^(?:1?\s*\/\s*)?[A-Za-z(]/;
const LONGEST_TEXT = 64;

/** What was wrong with a quantity, in words that follow "must be …" or stand alone. */
export class QuantityError extends Error {}

/** Unit text → factor to the fixed unit, for the kind: parsing a unit costs 20 µs. */
const factors = new Map<string, number | QuantityError>();
const MOST_FACTORS = 1000;

function unitFactor(unitText: string, of: QuantityKind): number {
  const key = `${of.unit}|${unitText}`;
  let factor = factors.get(key);
  if (factor === undefined) {
    try {
      factor = readUnit(unitText, of);
    } catch (error) {
      if (!(error instanceof QuantityError)) throw error;
      factor = error;
    }
    if (factors.size >= MOST_FACTORS) factors.clear();
    factors.set(key, factor);
  }
  if (factor instanceof QuantityError) throw factor;
  return factor;
}

function readUnit(unitText: string, of: QuantityKind): number {
  const unknown = (unitText.match(/[A-Za-z_]+/g) ?? []).find((name) => !UNIT_NAMES.has(name));
  if (unknown) throw new QuantityError(`unknown unit "${unknown}"; give ${of.name} such as "${of.example}"`);
  const wrong = new QuantityError(
    `"${unitText}" is not a unit of ${of.name.replace(/^an? /, '')}; give ${of.name} such as "${of.example}"`,
  );
  if (!UNIT_START.test(unitText)) throw wrong;
  let unit: MathJs.Unit;
  try {
    unit = math.unit(1, unitText.replaceAll('*', ' ').replace(/^1?\s*\//, '1/'));
  } catch {
    throw wrong;
  }
  for (const [expression, worth] of of.ways) {
    if (!unit.equalBase(math.unit(expression))) continue;
    // 15 digits take the rounding of unit arithmetic away: 1 GeV/cm^3 must be exactly 1 GeV/cm^3
    const factor = Number((unit.toNumber(expression) * worth).toPrecision(15));
    if (factor > 0 && factor < Infinity) return factor;
  }
  throw wrong;
}

/** A number with a unit, in the kind's fixed unit. Throws QuantityError. */
export function quantityOf(value: number, unitText: string, of: QuantityKind): number {
  if (!/^[\x20-\x7e]{1,64}$/.test(unitText))
    throw new QuantityError(`a unit is 1 to ${LONGEST_TEXT} printable ASCII characters`);
  const factor = unitFactor(unitText.trim(), of);
  // dividing by a whole number rounds correctly where multiplying by its inverse does not: 700 keV is 0.7 MeV
  const result = factor < 1 ? value / Number((1 / factor).toPrecision(15)) : value * factor;
  if (!Number.isFinite(result)) throw new QuantityError('the number is not finite');
  return result;
}

/**
 * "10 MeV" in the kind's fixed unit. At most 64 printable ASCII characters; throws QuantityError with what would be right.
 *
 * @example parseQuantity('0.4 GeV/c^2/cm^3', KINDS.density) // 0.4
 */
export function parseQuantity(text: string, of: QuantityKind): number {
  if (text.length > LONGEST_TEXT)
    throw new QuantityError(`longer than ${LONGEST_TEXT} characters; give ${of.name} such as "${of.example}"`);
  if (!/^[\x20-\x7e]*$/.test(text))
    throw new QuantityError(`not printable ASCII; give ${of.name} such as "${of.example}"`);
  const match = NUMBER.exec(text);
  if (!match) throw new QuantityError(`no number before the unit; give ${of.name} such as "${of.example}"`);
  if (match[2].trim() === '') throw new QuantityError(`no unit; give ${of.name} such as "${of.example}"`);
  return quantityOf(Number(match[1]), match[2], of);
}
