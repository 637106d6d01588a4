import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { ELECTRON_MASS_EV, HBAR_C_EV_ANGSTROM, REFERENCE_MOMENTUM_EV } from '../../../physics/constants.ts';
import type { CrystalTable } from '../../../physics/crystal/crystal-table.ts';
import { responseOf } from '../../../physics/crystal/dielectric.ts';
import { rowFifthPowersEv5 } from '../../../physics/crystal/fifth-power.ts';
import type { Finding, FindingCode, Grade, QualityReport, TableClaims } from '../../../physics/crystal/quality.ts';
import { qualityReport } from '../../../physics/crystal/quality.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import { builtInTable } from '../../support/built-in-table.ts';
import { ridgeTable } from '../../support/exact-tables.ts';

const halo = standardHalo({
  circularSpeedKmPerS: 238,
  escapeSpeedKmPerS: 544,
  laboratorySpeedKmPerS: 250,
  cutoff: 'sharp',
});

const ELECTRONS: Readonly<Record<string, number>> = { silicon: 8, germanium: 28, diamond: 8, 'gallium-arsenide': 28 };

function builtIn(crystal: string, screened: boolean): { table: CrystalTable; claims: TableClaims } {
  const { table, bandGapEv, energyPerPairEv } = builtInTable(crystal, screened);
  return { table, claims: { screened, electronsPerCell: ELECTRONS[crystal], bandGapEv, energyPerPairEv } };
}

function withCode(report: QualityReport, code: FindingCode): Finding[] {
  return report.findings.filter((finding) => finding.code === code);
}

function gradesOf(report: QualityReport): [FindingCode, Grade][] {
  return report.findings.filter(({ grade }) => grade !== 'fine').map(({ code, grade }) => [code, grade]);
}

const silicon = builtIn('silicon', true);

/** Axes in another unit: the same numbers, said to be eV. */
function scaled({ table, claims }: typeof silicon, momentum: number, energy = 1): [CrystalTable, TableClaims] {
  return [
    {
      ...table,
      momentumEv: table.momentumEv.map((q) => q * momentum),
      energyEv: table.energyEv.map((e) => e * energy),
    },
    claims,
  ];
}

describe('qualityReport: built-in tables', () => {
  it.each([
    ['silicon', true, 'fine', 8, 7.46],
    ['silicon', false, 'fine', 8, 7.57],
    ['diamond', true, 'fine', 8, 7.78],
    ['diamond', false, 'fine', 8, 7.92],
    ['germanium', true, 'look', 28, 8.87],
    ['germanium', false, 'look', 28, 9.76],
    ['gallium-arsenide', true, 'look', 28, 9.31],
    ['gallium-arsenide', false, 'look', 28, 10.3],
  ])(
    '%s, screened %s: %s; of %s electrons %s respond below the last energy',
    (crystal, screened, verdict, _, found) => {
      const { table, claims } = builtIn(crystal, screened);
      const report = qualityReport(table, claims, halo);
      expect(report.verdict).toBe(verdict);
      expect(Math.abs(report.electronsFound! / found - 1)).toBeLessThan(0.01);
      expect(Math.abs(report.onsetEv! - claims.bandGapEv!)).toBeLessThan(0.11);
      expect(report.opticalLimit).toBeDefined();
      expect(report.sumRule!.share).toHaveLength(720);
      expect(report.masses.map(({ mediator }) => mediator)).toEqual(['heavy', 'light']);
      for (const { detail } of report.findings) expect(detail).toMatch(/^[A-Z0-9].*\.$/);
      expect(JSON.stringify(report)).not.toMatch(/NaN|Infinity|null/);
    },
  );

  it.each([
    ['germanium', true],
    ['germanium', false],
    ['gallium-arsenide', true],
    ['gallium-arsenide', false],
  ])(
    '%s, screened %s: the low share is explained by strength (3d) above 50 eV and nothing is wrong',
    (crystal, screened) => {
      const { table, claims } = builtIn(crystal, screened);
      const report = qualityReport(table, claims, halo);
      const [finding] = withCode(report, 'strength-above');
      expect(finding.grade).toBe('look');
      expect(finding.detail).toMatch(/28 electrons below 50 eV is 0\.\d+ to 0\.\d+, median 0\.3\d+/);
      expect(finding.detail).toMatch(/strength does go on beyond the table.*3d.*rates above 50 eV are missing/);
      expect(gradesOf(report).filter(([code]) => code !== 'masses')).toEqual([['strength-above', 'look']]);
    },
  );

  it('silicon: axes, steps and the lightest mass 2 E_gap/v_max² (E_gap 1.12 eV, v_max 794 km/s: 0.3193 MeV)', () => {
    const report = qualityReport(silicon.table, silicon.claims, halo);
    expect(report.energy).toMatchObject({ kind: 'edges', count: 501, fromEv: 0, toEv: 50 });
    expect(report.momentum.count).toBe(721);
    expect(report.momentum.stepEv.smallest).toBeCloseTo(93.2235, 6);
    for (const { fromEv } of report.masses) expect(Math.abs(fromEv / 0.3193e6 - 1)).toBeLessThan(1e-3);
  });
});

describe('qualityReport: wrong units', () => {
  const alphaMe = REFERENCE_MOMENTUM_EV / 1e3;
  const perAngstrom = HBAR_C_EV_ANGSTROM / 1e3;
  const hartree = REFERENCE_MOMENTUM_EV ** 2 / ELECTRON_MASS_EV;
  // the axis as the calculation then sees it, in units of what it should be
  it.each([
    ['numbers in eV said to be keV', 1e3, 1, 'eV', 'momentum'],
    ['numbers in alpha m_e said to be keV', 1 / alphaMe, 1, 'alpha m_e (1/bohr)', 'momentum'],
    ['numbers in 1/angstrom said to be keV', 1 / perAngstrom, 1, '1/angstrom', 'momentum'],
    ['numbers in keV said to be eV', 1e-3, 1, 'keV', 'momentum'],
    ['numbers in keV said to be 1/bohr', alphaMe, 1, 'keV', 'momentum'],
    ['numbers in keV said to be 1/angstrom', perAngstrom, 1, 'keV', 'momentum'],
    ['energies in hartree said to be eV', 1, 1 / hartree, 'hartree', 'energy'],
    ['energies in meV said to be eV', 1, 1e3, 'meV', 'energy'],
  ])('%s: wrong, whatever the crystal and its screening', (_name, momentum, energy, unit, axis) => {
    let compared = 0;
    for (const crystal of Object.keys(ELECTRONS)) {
      for (const screened of [true, false]) {
        const report = qualityReport(...scaled(builtIn(crystal, screened), momentum, energy), halo);
        expect(report.verdict).toBe('wrong');
        const [finding] = withCode(report, 'units');
        expect(finding.grade, crystal).toBe('wrong');
        expect(finding.detail, crystal).toContain(`read in ${unit} instead of`);
        expect(finding.detail, crystal).toContain(`the ${axis} axis would be`);
        expect(finding.detail, crystal).toContain(`so ${unit} is the unit that would fit`);
        expect(report.masses).toEqual([]);
        compared++;
      }
    }
    expect(compared).toBe(8);
  });

  it('a loss function, whose share no unit of momentum changes, is judged by where the ridge is', () => {
    const { table, claims } = builtIn('silicon', true);
    const loss: CrystalTable = { ...table, quantity: 'lossFunction', values: responseOf(table) };
    expect(qualityReport(loss, claims, halo).verdict).toBe('fine');
    for (const [factor, unit] of [
      [1e3, 'eV'],
      [1 / alphaMe, 'alpha m_e (1/bohr)'],
      [1e-3, 'keV'],
    ] as const) {
      const [finding] = withCode(qualityReport(...scaled({ table: loss, claims }, factor), halo), 'units');
      expect(finding.detail).toContain(`so ${unit} is the unit that would fit`);
    }
  });

  it('a known unit leaves only readings that begin with it', () => {
    const [table, claims] = scaled(silicon, 1 / alphaMe);
    const [finding] = withCode(qualityReport(table, { ...claims, momentumUnit: 'keV' }, halo), 'units');
    expect(finding.detail).toContain('read in alpha m_e (1/bohr) instead of keV');
    const [inKev, own] = scaled(silicon, perAngstrom / 10);
    const [other] = withCode(qualityReport(inKev, { ...own, momentumUnit: '1/nm' }, halo), 'units');
    expect(other.detail).toContain('read in keV instead of 1/nm');
  });

  it('without electronsPerCell the unit is still found, against all electrons of the cell', () => {
    for (const [factor, unit] of [
      [1e3, 'eV'],
      [1 / alphaMe, 'alpha m_e (1/bohr)'],
    ] as const) {
      const [table, claims] = scaled(silicon, factor);
      const report = qualityReport(table, { ...claims, electronsPerCell: undefined }, halo);
      expect(withCode(report, 'units')[0].detail).toContain(`so ${unit} is the unit that would fit`);
    }
  });
});

describe('qualityReport: other faults', () => {
  const { table, claims } = silicon;
  const unscreened = builtIn('silicon', false);

  it.each<[string, CrystalTable, TableClaims, FindingCode, Grade, RegExp]>([
    ['unscreened numbers said to be screened', unscreened.table, claims, 'screening', 'wrong', /no loss function/],
    [
      'screened numbers said to be unscreened',
      table,
      unscreened.claims,
      'screening',
      'look',
      /small for a gap of 1.12 eV/,
    ],
    [
      'half the electrons',
      table,
      { ...claims, electronsPerCell: 4 },
      'sum-rule',
      'wrong',
      /more strength than the electrons have/,
    ],
    [
      'all 28 electrons',
      table,
      { ...claims, electronsPerCell: 28 },
      'strength-above',
      'look',
      /check electronsPerCell/,
    ],
    [
      'electrons not given',
      table,
      { ...claims, electronsPerCell: undefined },
      'electrons',
      'look',
      /comes to 7\.\d+ electrons/,
    ],
    ['a gap of 3 eV', table, { ...claims, bandGapEv: 3 }, 'onset', 'look', /what lies below the gap is not counted/],
    ['a gap above the table', table, { ...claims, bandGapEv: 60 }, 'onset', 'wrong', /above the whole table/],
    ['no gap', table, { ...claims, bandGapEv: 0 }, 'onset', 'look', /are empty/],
    ['nothing', { ...table, values: table.values.map(() => 0) }, claims, 'values', 'wrong', /Every value is 0/],
    [
      'a negative value',
      { ...table, values: table.values.map((v, i) => (i === 5 ? -1 : v)) },
      claims,
      'values',
      'wrong',
      /^1 of 360000/,
    ],
    ['bins narrower than cells', table, { ...claims, energyPerPairEv: 0.15 }, 'axes', 'look', /wide for electron bins/],
  ])('%s', (_name, faulty, said, code, grade, detail) => {
    const report = qualityReport(faulty, said, halo);
    const found = withCode(report, code).find((finding) => finding.grade === grade);
    expect(found?.detail).toMatch(detail);
    expect(report.verdict === grade || report.verdict === 'wrong').toBe(true);
    expect(JSON.stringify(report)).not.toMatch(/NaN|Infinity/);
  });

  it('noise of 20 % a cell is found as 20 %, within a tenth, and divided among the cells of a bin', () => {
    let state = 1;
    const uniform = (): number => {
      state = (state * 48271) % 2147483647; // Lehmer
      return state / 2147483647;
    };
    const normal = (): number => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform());
    const noisy = { ...table, values: table.values.map((v) => v * Math.max(0.01, 1 + 0.2 * normal())) };
    const { roughness } = qualityReport(noisy, claims, halo);
    expect(Math.abs(roughness.perCell / 0.2 - 1)).toBeLessThan(0.1);
    expect(roughness.perBin! / roughness.perCell).toBeLessThan(0.05);
    expect(qualityReport(table, claims, halo).roughness.perCell).toBeLessThan(0.01);
  });

  it('a table cut at 5 keV or at 12 eV covers lighter masses only, and says which end comes first', () => {
    const cut = (rows: number, columns: number): CrystalTable => ({
      ...table,
      momentumEv: table.momentumEv.slice(0, rows + 1),
      energyEv: table.energyEv.slice(0, columns + 1),
      values: Float64Array.from(
        { length: rows * columns },
        (_, at) => table.values[Math.floor(at / columns) * 500 + (at % columns)],
      ),
    });
    const [slow, low] = [cut(54, 500), cut(720, 120)].map((short) => qualityReport(short, claims, halo).masses[0]);
    expect(slow.limit).toBe('momentum');
    expect(low.limit).toBe('energy');
    // E_max = ½ m v_max² is 12 eV at 3.42 MeV, and q_max = 2 m v_max is 5.03 keV at 0.95 MeV: no less can be covered
    expect(low.toEv).toBeGreaterThan(3.4e6);
    expect(slow.toEv).toBeGreaterThan(0.94e6);
    for (const { toEv } of [slow, low]) expect(toEv).toBeLessThan(1e8);
    const late = { ...table, momentumEv: table.momentumEv.slice(40), values: table.values.slice(40 * 500) };
    const [, light] = qualityReport(late, claims, halo).masses;
    expect(light.lowerMomentumShare).toBeGreaterThan(0.01);
  });

  it('a table that ends early is short, not in another unit: every crystal cut at 6 to 40 eV', () => {
    let compared = 0;
    for (const crystal of Object.keys(ELECTRONS)) {
      for (const screened of [true, false]) {
        const { table: whole, claims: own } = builtIn(crystal, screened);
        for (const topEv of [6, 12, 18, 25, 40]) {
          if (topEv < own.bandGapEv! + 1) continue;
          const columns = Math.round(topEv / whole.energyEv[1]);
          const all = whole.energyEv.length - 1;
          const short = {
            ...whole,
            energyEv: whole.energyEv.slice(0, columns + 1),
            values: Float64Array.from(
              { length: 720 * columns },
              (_, at) => whole.values[Math.floor(at / columns) * all + (at % columns)],
            ),
          };
          const report = qualityReport(short, own, halo);
          expect(withCode(report, 'units'), `${crystal} ${topEv}`).toEqual([]);
          compared++;
        }
      }
    }
    expect(compared).toBe(38);
  });

  it('as points at the middles of its cells silicon has the same report', () => {
    const middles = (axis: Float64Array): Float64Array => axis.subarray(1).map((x, i) => (x + axis[i]) / 2);
    const means = rowFifthPowersEv5(table);
    const perMean = middles(table.momentumEv).map((q, i) => q ** 5 / means[i]);
    const points: CrystalTable = {
      ...table,
      axes: 'points',
      momentumEv: middles(table.momentumEv),
      energyEv: middles(table.energyEv),
      values: table.values.map((value, at) => value * perMean[Math.floor(at / 500)]),
    };
    const [own, other] = [table, points].map((given) => qualityReport(given, claims, halo));
    expect(gradesOf(other)).toEqual(gradesOf(own));
    expect(other.electronsFound! / own.electronsFound!).toBeCloseTo(1, 1);
    expect(Math.abs(other.opticalLimit!.plasmonEv! - own.opticalLimit!.plasmonEv!)).toBeLessThan(0.3);
    expect(
      Math.abs(other.opticalLimit!.staticDielectric!.value / own.opticalLimit!.staticDielectric!.value - 1),
    ).toBeLessThan(0.02);
  });

  it('any table gets a report of finite numbers', () => {
    const axis = fc
      .array(fc.double({ min: 1e-3, max: 2e4, noNaN: true }), { minLength: 3, maxLength: 6 })
      .map((steps) =>
        Float64Array.from(
          steps.map((_, i) => steps.slice(1, i + 1).reduce((a, b) => a + b, steps[0] > 1e4 ? 0 : steps[0])),
        ),
      );
    const anyTable = fc.record({
      axes: fc.constantFrom('edges' as const, 'points' as const),
      quantity: fc.constantFrom('formFactorSquared' as const, 'lossFunction' as const),
      momentumEv: axis,
      energyEv: axis.map((energies) => energies.map((e) => e / 300)),
      seed: fc.array(fc.double({ min: 0, max: 10, noNaN: true }), { minLength: 36, maxLength: 36 }),
      screened: fc.boolean(),
      electronsPerCell: fc.option(fc.double({ min: 0.5, max: 100, noNaN: true }), { nil: undefined }),
      bandGapEv: fc.option(fc.double({ min: 0, max: 10, noNaN: true }), { nil: undefined }),
      energyPerPairEv: fc.option(fc.double({ min: 10, max: 20, noNaN: true }), { nil: undefined }),
    });
    let reports = 0;
    fc.assert(
      fc.property(anyTable, ({ axes, quantity, momentumEv, energyEv, seed, ...said }) => {
        const less = axes === 'edges' ? 1 : 0;
        const size = (momentumEv.length - less) * (energyEv.length - less);
        const values = Float64Array.from(seed.slice(0, size));
        const given: CrystalTable = {
          axes,
          quantity,
          momentumEv,
          energyEv,
          values,
          cellMassEv: 5e10,
          cellVolumeAngstrom3: 40,
        };
        const report = qualityReport(given, said, halo);
        expect(
          JSON.stringify(report, (_key, value) =>
            Number.isNaN(value) || Math.abs(value) === Infinity ? 'BAD' : value,
          ),
        ).not.toMatch(/BAD|NaN|Infinity/);
        reports++;
      }),
      { numRuns: 8, seed: 5 },
    );
    expect(reports).toBe(8);
  });

  it('free electrons at rest: all of the sum rule, and no unit fits better', () => {
    const ridge = ridgeTable(1e7, halo.largestSpeedKmPerS, 120);
    const report = qualityReport(
      ridge,
      { screened: false, electronsPerCell: 8, bandGapEv: undefined, energyPerPairEv: undefined },
      halo,
    );
    expect(withCode(report, 'units')).toEqual([]);
    expect(report.electronsFound).toBeCloseTo(8, 1);
  });
});
