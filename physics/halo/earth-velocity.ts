/**
 * The Earth's velocity around the Sun, and with it the laboratory's through the halo, on a date.
 *
 * The Earth moves on a Kepler ellipse. With l its heliocentric longitude, ϖ the longitude of its perihelion, e the
 * eccentricity,
 *
 *   v = k (−sin l − e sin ϖ, cos l + e cos ϖ, 0) in the ecliptic,    k = n a/√(1 − e²)
 *
 * l from the low-precision longitude of the Sun, good to 0.01° (J. Meeus, Astronomical Algorithms, 2nd ed., ch. 25):
 * 0.005 km/s. What is neglected: the pull of the Moon (0.013 km/s) and the planets, the turning of the ecliptic's plane
 * (0.007 km/s a century from 2000), the Earth's rotation (0.5 km/s at most, zero on average over a day: the laboratory's
 * place is not asked for).
 */
import { DomainError } from '../errors.ts';
import type { GalacticVelocity } from './galactic-velocity.ts';
import { requireVelocity, speedOf, velocitySum } from './galactic-velocity.ts';

/** Sun's velocity with respect to the local standard of rest (Schönrich, Binney & Dehnen, MNRAS 403, 1829 (2010)), km/s. */
export const PECULIAR_VELOCITY_KM_PER_S: GalacticVelocity = [11.1, 12.2, 7.3];

const DAY_MS = 86_400_000;
/** 2000-01-01 12:00, in milliseconds of the civil era. TT runs ahead of UTC by about a minute: 0.0005 km/s. */
const J2000_MS = Date.UTC(2000, 0, 1, 12);
const CENTURY_DAYS = 36_525;
/** Years in which the neglected terms stay below 0.03 km/s. */
export const FIRST_YEAR = 1950;
export const LAST_YEAR = 2100;
const FIRST_MS = Date.UTC(FIRST_YEAR, 0, 1);
const END_MS = Date.UTC(LAST_YEAR + 1, 0, 1);

const DEGREE = Math.PI / 180;
/** Astronomical unit, km: exact (IAU 2012, Resolution B2). */
const ASTRONOMICAL_UNIT_KM = 149_597_870.7;
/**
 * n a, km/s: Earth's sidereal year is 365.256363 days (Astronomical Almanac), its semi-major axis 1.000001018 au (Meeus,
 * table 31.A).
 */
const CIRCULAR_KM_PER_S = (2 * Math.PI * 1.000001018 * ASTRONOMICAL_UNIT_KM) / (365.256363 * 86_400);
/** General precession in longitude, degrees a century (IAU 1976: 5029.0966″): from the equinox of date to that of 2000. */
const PRECESSION_DEG = 5029.0966 / 3600;
/** Obliquity of the ecliptic at J2000 (IAU 1976: 23° 26′ 21.448″). */
const OBLIQUITY = (23 + 26 / 60 + 21.448 / 3600) * DEGREE;
/**
 * Equatorial (J2000) to galactic: the IAU 1958 system (Blaauw et al., MNRAS 121, 123 (1960)), pole α 192.85948°, δ
 * 27.12825°, node l 32.93192° (The Hipparcos and Tycho Catalogues, ESA SP-1200, vol. 1, eq. 1.5.11).
 */
const TO_GALACTIC = [
  [-0.0548755604, -0.8734370902, -0.4838350155],
  [0.4941094279, -0.44482963, 0.7469822445],
  [-0.867666149, -0.1980763734, 0.4559837762],
] as const;

/**
 * Earth's heliocentric velocity in the galactic frame (U, V, W), km/s, at a UTC instant in milliseconds since 1970.
 *
 * Domain: the years 1950 to 2100. Accuracy: 0.02 km/s a component (test/physics/halo/earth-velocity.test.ts, against an
 * astronomy library's built-in ephemeris given to 0.01 km/s).
 *
 * @throws DomainError outside those years, or for what is no instant
 * @example earthVelocity(Date.UTC(2026, 5, 2)) // [8.17, 14.77, −24.03]
 */
export function earthVelocity(utcMs: number): GalacticVelocity {
  if (!(utcMs >= FIRST_MS && utcMs < END_MS))
    throw new DomainError('date', utcMs, `an instant in the years ${FIRST_YEAR} to ${LAST_YEAR}`);
  const t = (utcMs - J2000_MS) / DAY_MS / CENTURY_DAYS;
  // Meeus, eqs. 25.2 to 25.4 and the equation of the centre, degrees
  const meanLongitude = 280.46646 + t * (36_000.76983 + t * 0.0003032);
  const meanAnomaly = 357.52911 + t * (35_999.05029 - t * 0.0001537);
  const e = 0.016708634 - t * (0.000042037 + t * 0.0000001267);
  const m = meanAnomaly * DEGREE;
  const centre =
    (1.914602 - t * (0.004817 + t * 0.000014)) * Math.sin(m) +
    (0.019993 - t * 0.000101) * Math.sin(2 * m) +
    0.000289 * Math.sin(3 * m);
  const toEarthAndJ2000 = 180 - PRECESSION_DEG * t;
  const longitude = (meanLongitude + centre + toEarthAndJ2000) * DEGREE;
  const perihelion = (meanLongitude - meanAnomaly + toEarthAndJ2000) * DEGREE;

  const k = CIRCULAR_KM_PER_S / Math.sqrt(1 - e * e);
  const x = -k * (Math.sin(longitude) + e * Math.sin(perihelion));
  const inEcliptic = k * (Math.cos(longitude) + e * Math.cos(perihelion));
  const y = inEcliptic * Math.cos(OBLIQUITY);
  const z = inEcliptic * Math.sin(OBLIQUITY);
  const [u, v, w] = TO_GALACTIC.map((row) => row[0] * x + row[1] * y + row[2] * z);
  return [u, v, w];
}

/**
 * The laboratory's velocity through the galaxy, km/s: rotation (0, v₀, 0), the Sun's own and, on a date, the Earth's.
 * Without a date it is the Sun's, which is not quite the year's mean: the orbit's component across the motion adds 1.5
 * km/s to that.
 *
 * @throws DomainError as earthVelocity, and for velocities that are not finite or not below the speed of light
 */
export function laboratoryVelocity(
  circularSpeedKmPerS: number,
  peculiarKmPerS: GalacticVelocity = PECULIAR_VELOCITY_KM_PER_S,
  utcMs?: number,
): GalacticVelocity {
  requireVelocity('circularSpeed', [0, circularSpeedKmPerS, 0]);
  requireVelocity('peculiarVelocity', peculiarKmPerS);
  const sun = velocitySum([0, circularSpeedKmPerS, 0], peculiarKmPerS);
  const velocity = utcMs === undefined ? sun : velocitySum(sun, earthVelocity(utcMs));
  requireVelocity('laboratorySpeed', velocity);
  return velocity;
}

/** v_E = |(0, v₀, 0) + peculiar + Earth's|, km/s. @throws DomainError as laboratoryVelocity */
export function laboratorySpeedKmPerS(
  circularSpeedKmPerS: number,
  peculiarKmPerS: GalacticVelocity = PECULIAR_VELOCITY_KM_PER_S,
  utcMs?: number,
): number {
  return speedOf(laboratoryVelocity(circularSpeedKmPerS, peculiarKmPerS, utcMs));
}

/**
 * v_E, km/s, after the circular speed has changed by some km/s, for a laboratory whose speed was given without a date:
 * the circular speed is also the Sun's rotation, so that the laboratory's velocity, taken along the Sun's, gains (0,
 * change, 0).
 *
 * @example shiftedLaboratorySpeedKmPerS(250, 238, 1.5) // 251.498
 */
export function shiftedLaboratorySpeedKmPerS(
  givenKmPerS: number,
  circularSpeedKmPerS: number,
  changeKmPerS: number,
  peculiarKmPerS: GalacticVelocity = PECULIAR_VELOCITY_KM_PER_S,
): number {
  const sun = laboratoryVelocity(circularSpeedKmPerS, peculiarKmPerS);
  const share = givenKmPerS / speedOf(sun);
  return Math.hypot(share * sun[0], share * sun[1] + changeKmPerS, share * sun[2]);
}
