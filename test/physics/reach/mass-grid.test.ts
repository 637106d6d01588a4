import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import {
  bestPoint,
  lightestMassMev,
  listedMasses,
  logSpacedMasses,
  lowestFeedingEnergyEv,
} from '../../../physics/reach/mass-grid.ts';

describe('logSpacedMasses', () => {
  it.each([
    { range: { fromMev: 1, toMev: 100, count: 3 }, masses: [1, 10, 100] },
    { range: { fromMev: 0.1, toMev: 1000, count: 5 }, masses: [0.1, 1, 10, 100, 1000] },
    { range: { fromMev: 0.5, toMev: 8, count: 5 }, masses: [0.5, 1, 2, 4, 8] },
    { range: { fromMev: 2, toMev: 3, count: 2 }, masses: [2, 3] },
  ])('gives decimal numbers where the masses are: $masses', ({ range, masses }) => {
    expect(logSpacedMasses(range)).toEqual(masses);
  });

  it('returns both ends as given and equal ratios between', () => {
    const masses = logSpacedMasses({ fromMev: 0.51099895069, toMev: 987.6543210987654, count: 60 });
    expect(masses).toHaveLength(60);
    expect([masses[0], masses[59]]).toEqual([0.51099895069, 987.6543210987654]);
    const ratio = (masses[59] / masses[0]) ** (1 / 59);
    for (let i = 1; i < 60; i++) expect(Math.abs(masses[i] / masses[i - 1] / ratio - 1)).toBeLessThan(1e-12);
  });

  it('refuses ranges that are not one', () => {
    const faults = [
      { fromMev: 0, toMev: 1, count: 3 },
      { fromMev: 2, toMev: 1, count: 3 },
      { fromMev: 1, toMev: 1, count: 3 },
      { fromMev: 1, toMev: Infinity, count: 3 },
      { fromMev: 1, toMev: 2, count: 1 },
      { fromMev: 1, toMev: 2, count: 2.5 },
      { fromMev: 1, toMev: 1 + 1e-14, count: 100 },
    ];
    for (const range of faults) expect(() => logSpacedMasses(range)).toThrow(DomainError);
  });
});

describe('listedMasses', () => {
  it('keeps the order, and names what it refuses', () => {
    expect(listedMasses([10, 1, 10])).toEqual([10, 1, 10]);
    expect(() => listedMasses([])).toThrow(DomainError);
    expect(() => listedMasses([1, Number.NaN])).toThrow(/values\.1/);
  });
});

describe('lowestFeedingEnergyEv', () => {
  it.each([
    { why: 'first bin: the gap', energies: [0, 50], electrons: 1, energy: 1.12 },
    { why: 'second bin: one pair more', energies: [0, 50], electrons: 2, energy: 4.92 },
    { why: 'a table that begins above the gap', energies: [3, 50], electrons: 1, energy: 3 },
    { why: 'a table that ends where the bin begins', energies: [0, 4.92], electrons: 2, energy: undefined },
    { why: 'a table that ends below the bin', energies: [0, 4], electrons: 2, energy: undefined },
  ])('$why', ({ energies, electrons, energy }) => {
    expect(lowestFeedingEnergyEv(energies, 1.12, 3.8, electrons)).toBe(energy);
  });
});

describe('lightestMassMev', () => {
  // 2 E/v_max² by hand, v_max = 794 km/s = 2.648499e-3 c: 2 × 4.92/7.014547e-6 = 1.402799e6 eV.
  it.each([
    { energyEv: 4.92, splittingEv: 0, massMev: 1.402799 },
    { energyEv: 1.12, splittingEv: 0, massMev: 0.319336 },
    { energyEv: 1.12, splittingEv: 3.8, massMev: 1.402799 },
    { energyEv: 4.92, splittingEv: -3.8, massMev: 0.319336 },
  ])('for $energyEv eV and δ = $splittingEv eV is $massMev MeV', ({ energyEv, splittingEv, massMev }) => {
    expect(lightestMassMev(energyEv, splittingEv, 794)).toBeCloseTo(massMev, 5);
  });

  it('refuses an energy that every mass can give', () => {
    expect(() => lightestMassMev(1.12, -1.12, 794)).toThrow(DomainError);
    expect(() => lightestMassMev(1.12, 0, 0)).toThrow(DomainError);
  });
});

describe('bestPoint', () => {
  const at = (massMev: number, crossSectionCm2: number | null) => ({ massMev, crossSectionCm2 });

  it('is the smallest cross section, of equal ones the lightest mass', () => {
    expect(bestPoint([at(1, null), at(5, 2e-38), at(30, 1e-38), at(10, 1e-38), at(60, 3e-38)])).toEqual(at(10, 1e-38));
  });

  it('is none where nothing is reached', () => {
    expect(bestPoint([at(1, null), at(2, null)])).toBeUndefined();
    expect(bestPoint([])).toBeUndefined();
  });
});
