/** The masses of a reach curve, MeV; the mass below which nothing is reached; the mass at which most is. */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import { DomainError, requirePositive } from '../errors.ts';
import { stepEdgeEv } from '../ionization/step.ts';
import { smallestMassEv } from '../kinematics/kinematics.ts';

/** `count` masses, evenly spaced in the logarithm, both ends among them. */
export interface MassRange {
  readonly fromMev: number;
  readonly toMev: number;
  readonly count: number;
}

/** Masses are asked for, hashed and compared as decimal numbers: 1, 10, 100 and not 9.999999999999998. */
const DIGITS = 14;

/**
 * The masses of a range, ascending. The ends are returned as given, what is between is rounded to 14 digits.
 *
 * @throws DomainError unless 0 < fromMev < toMev are finite and `count` is an integer of at least 2 that keeps the masses apart.
 * @example logSpacedMasses({ fromMev: 1, toMev: 100, count: 3 }) // [1, 10, 100]
 */
export function logSpacedMasses({ fromMev, toMev, count }: MassRange): number[] {
  requirePositive('from', fromMev);
  requirePositive('to', toMev);
  if (!(toMev > fromMev)) throw new DomainError('to', toMev, `above the first mass, ${fromMev} MeV`);
  if (!(Number.isInteger(count) && count >= 2)) throw new DomainError('count', count, 'an integer of at least 2');
  const [lnFrom, lnTo] = [Math.log(fromMev), Math.log(toMev)];
  const masses = Array.from({ length: count }, (_, i) => {
    if (i === 0) return fromMev;
    if (i === count - 1) return toMev;
    return Number(Math.exp(lnFrom + ((lnTo - lnFrom) * i) / (count - 1)).toPrecision(DIGITS));
  });
  if (masses.some((mass, i) => i > 0 && mass <= masses[i - 1]))
    throw new DomainError('count', count, `so few that the masses differ in ${DIGITS} digits`);
  return masses;
}

/**
 * A list of masses, as given: any order, repetitions allowed.
 *
 * @throws DomainError for an empty list or a mass that is not a finite number above 0
 */
export function listedMasses(valuesMev: readonly number[]): number[] {
  if (valuesMev.length === 0) throw new DomainError('values', 0, 'at least one mass');
  valuesMev.forEach((mass, i) => {
    if (!(mass > 0 && mass < Infinity)) throw new DomainError(['values', i], mass, 'a finite number above 0');
  });
  return [...valuesMev];
}

/**
 * The lowest energy, eV, that feeds a window from `firstElectrons` on in the step model: the bin's lower edge, or where the table
 * begins if that is higher. undefined where the table ends below it: no energy does.
 */
export function lowestFeedingEnergyEv(
  tableEnergyEv: ArrayLike<number>,
  bandGapEv: number,
  energyPerPairEv: number,
  firstElectrons: number,
): number | undefined {
  const lowest = Math.max(stepEdgeEv(bandGapEv, energyPerPairEv, firstElectrons), tableEnergyEv[0]);
  return lowest < tableEnergyEv[tableEnergyEv.length - 1] ? lowest : undefined;
}

/**
 * The mass, MeV, above which an energy E can be given to the crystal and at which it cannot yet: 2(E + δ)/v_max², exact. At this mass
 * itself rounding decides whether a rate is 0 or some 1e-40 of what is usual: a caller takes it as not reached.
 *
 * @param energyEv E, eV. @param splittingEv δ, eV; E + δ > 0. @param largestSpeedKmPerS v_max = v_esc + v_E of the halo.
 * @throws DomainError where E + δ ≤ 0: every mass reaches that.
 * @example lightestMassMev(4.92, 0, 794) // 1.4027…
 */
export function lightestMassMev(energyEv: number, splittingEv: number, largestSpeedKmPerS: number): number {
  requirePositive('largestSpeed', largestSpeedKmPerS);
  if (!(energyEv + splittingEv > 0 && energyEv + splittingEv < Infinity))
    throw new DomainError('massSplitting', splittingEv, `above minus the energy, −${energyEv} eV`);
  return smallestMassEv(energyEv, splittingEv, largestSpeedKmPerS / SPEED_OF_LIGHT_KM_PER_S) / 1e6;
}

/** A point of a reach curve. */
export interface CurvePoint {
  readonly massMev: number;
  /** Smallest σ̄ₑ, cm²; null where the goal is not reached. */
  readonly crossSectionCm2: number | null;
}

/** The computed point with the smallest cross section, of equal ones the lightest; undefined where none is reached. */
export function bestPoint<P extends CurvePoint>(points: readonly P[]): P | undefined {
  let best: P | undefined;
  for (const point of points) if (point.crossSectionCm2 !== null && isBetter(point, best)) best = point;
  return best;
}

function isBetter(point: CurvePoint, best: CurvePoint | undefined): boolean {
  if (best === undefined) return true;
  const [here, there] = [point.crossSectionCm2!, best.crossSectionCm2!];
  return here < there || (here === there && point.massMev < best.massMev);
}
