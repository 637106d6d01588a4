import { describe, expect, it } from 'vitest';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../../physics/constants.ts';
import { DomainError } from '../../../physics/errors.ts';
import {
  earthVelocity,
  laboratorySpeedKmPerS,
  laboratoryVelocity,
  PECULIAR_VELOCITY_KM_PER_S,
  shiftedLaboratorySpeedKmPerS,
} from '../../../physics/halo/earth-velocity.ts';
import { speedOf } from '../../../physics/halo/galactic-velocity.ts';

/** Heliocentric velocity from a general-purpose astronomy library's built-in ephemeris (project physics notes), km/s. */
const DATES = [
  { date: '2026-03-21', velocity: [29.75, 3.09, 0.42], laboratory: 256.68 },
  { date: '2026-06-02', velocity: [8.17, 14.77, -24.03], laboratory: 266.19 },
  { date: '2026-09-23', velocity: [-29.47, -3.44, 0.25], laboratory: 247.56 },
  { date: '2026-12-02', velocity: [-8.74, -15.17, 24.61], laboratory: 237.2 },
];
const DAY_MS = 86_400_000;
const daysOf = (year: number): number[] =>
  Array.from(
    { length: (Date.UTC(year + 1, 0, 1) - Date.UTC(year, 0, 1)) / DAY_MS },
    (_, i) => Date.UTC(year, 0, 1) + i * DAY_MS,
  );

describe('earthVelocity', () => {
  // the ephemeris is given to 0.01, and includes the Moon's pull of 0.013 km/s
  it.each(DATES)('$date: within 0.025 km/s of the ephemeris in every component', ({ date, velocity }) => {
    const computed = earthVelocity(Date.parse(date));
    for (const i of [0, 1, 2]) expect(Math.abs(computed[i] - velocity[i]), `component ${i}`).toBeLessThan(0.025);
  });

  it('has the speeds of the orbit: 30.29 km/s at perihelion in early January, 29.29 at aphelion in early July', () => {
    // mean distances and speeds of the Earth Fact Sheet (NASA GSFC)
    for (const year of [1950, 2000, 2027, 2100]) {
      const speeds = daysOf(year).map((ms) => ({ ms, speed: speedOf(earthVelocity(ms)) }));
      const fastest = speeds.reduce((a, b) => (b.speed > a.speed ? b : a));
      const slowest = speeds.reduce((a, b) => (b.speed < a.speed ? b : a));
      expect(fastest.speed).toBeCloseTo(30.29, 2);
      expect(slowest.speed).toBeCloseTo(29.29, 2);
      expect(new Date(fastest.ms).toISOString()).toContain('-01-0');
      expect(new Date(slowest.ms).toISOString()).toContain('-07-0');
    }
  });

  it('closes: over a sidereal year the velocity comes back, and its time average is 0', () => {
    const start = Date.UTC(2027, 0, 1);
    const sidereal = 365.256363 * DAY_MS;
    const sum = [0, 0, 0];
    const steps = 720;
    for (let i = 0; i < steps; i++)
      earthVelocity(start + (i * sidereal) / steps).forEach((c, k) => {
        sum[k] += c / steps;
      });
    for (const c of sum) expect(Math.abs(c)).toBeLessThan(0.002);
    const [from, to] = [earthVelocity(start), earthVelocity(start + sidereal)];
    for (const k of [0, 1, 2]) expect(to[k]).toBeCloseTo(from[k], 2);
  });

  it('refuses instants outside 1950 to 2100, naming the date', () => {
    for (const ms of [Date.UTC(1949, 11, 31), Date.UTC(2101, 0, 1), Number.NaN, Infinity])
      expect(() => earthVelocity(ms)).toThrowError(expect.objectContaining({ parameter: ['date'] }));
    expect(speedOf(earthVelocity(Date.UTC(2100, 11, 31)))).toBeGreaterThan(29);
  });
});

describe('laboratorySpeedKmPerS', () => {
  it.each(DATES)('$date: $laboratory km/s with the default velocities', ({ date, laboratory }) => {
    expect(
      Math.abs(laboratorySpeedKmPerS(238, PECULIAR_VELOCITY_KM_PER_S, Date.parse(date)) - laboratory),
    ).toBeLessThan(0.025);
  });

  it('has the mean 252.1 over 2026, the extremes 266.2 on 2–3 June and 237.2 km/s on 3–4 December', () => {
    const speeds = daysOf(2026).map((ms) => ({
      ms,
      speed: laboratorySpeedKmPerS(238, PECULIAR_VELOCITY_KM_PER_S, ms),
    }));
    expect(speeds.reduce((sum, { speed }) => sum + speed, 0) / speeds.length).toBeCloseTo(252.1, 1);
    const fastest = speeds.reduce((a, b) => (b.speed > a.speed ? b : a));
    const slowest = speeds.reduce((a, b) => (b.speed < a.speed ? b : a));
    expect(fastest.speed).toBeCloseTo(266.2, 1);
    expect(slowest.speed).toBeCloseTo(237.2, 1);
    expect(['2026-06-02', '2026-06-03']).toContain(new Date(fastest.ms).toISOString().slice(0, 10));
    expect(['2026-12-03', '2026-12-04']).toContain(new Date(slowest.ms).toISOString().slice(0, 10));
  });

  it('is the Sun’s own 250.55 km/s without a date, and the length of the sum of the velocities', () => {
    expect(laboratorySpeedKmPerS(238)).toBeCloseTo(250.55, 2);
    expect(laboratoryVelocity(238)).toEqual([11.1, 250.2, 7.3]);
    expect(laboratorySpeedKmPerS(0, [3, 0, 4])).toBe(5);
  });

  it('refuses speeds that are not below c', () => {
    expect(() => laboratorySpeedKmPerS(SPEED_OF_LIGHT_KM_PER_S)).toThrow(DomainError);
    expect(() => laboratorySpeedKmPerS(238, [Number.NaN, 0, 0])).toThrow(/peculiarVelocity/);
  });
});

describe('shiftedLaboratorySpeedKmPerS: v₀ is also the Sun’s rotation', () => {
  it('is the Sun’s speed at the new v₀ if the Sun’s speed was given, the given one without a change', () => {
    for (const change of [-3, 0, 1.5, 40])
      expect(shiftedLaboratorySpeedKmPerS(laboratorySpeedKmPerS(238), 238, change)).toBeCloseTo(
        laboratorySpeedKmPerS(238 + change),
        10,
      );
    expect(shiftedLaboratorySpeedKmPerS(250, 238, 0)).toBeCloseTo(250, 12);
    // cosine of the angle between the Sun's velocity and the rotation: 250.2/250.55
    expect(shiftedLaboratorySpeedKmPerS(250, 238, 1.5)).toBeCloseTo(250 + 1.5 * 0.9986, 3);
  });
});
