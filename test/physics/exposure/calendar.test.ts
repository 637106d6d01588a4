import { describe, expect, it } from 'vitest';
import { dayReached } from '../../../physics/exposure/calendar.ts';

describe('dayReached', () => {
  it('is exposure over live mass for one payload: 0.04 kg yr with 100 g live 80 % of the time take half a year', () => {
    expect(dayReached([{ startDay: 10, massKg: 0.1, livetimeFraction: 0.8 }], 0.04)).toBeCloseTo(10 + 182.625, 10);
    expect(dayReached([{ startDay: 10, massKg: 0.1, livetimeFraction: 0.8 }], 0)).toBe(10);
  });

  it('adds up stages, each in the place of the one before', () => {
    const stages = [
      { startDay: 0, massKg: 1, livetimeFraction: 0.5 },
      { startDay: 100, massKg: 2, livetimeFraction: 1 },
      { startDay: 200, massKg: 10, livetimeFraction: 0.9 },
    ];
    // 50 kg days, then 200, then 9 a day
    const table = [
      { kgDays: 25, day: 50 },
      { kgDays: 50, day: 100 },
      { kgDays: 150, day: 150 },
      { kgDays: 250, day: 200 },
      { kgDays: 340, day: 210 },
    ];
    for (const { kgDays, day } of table) expect(dayReached(stages, kgDays / 365.25)).toBeCloseTo(day, 9);
  });
});
