/** The quality report of a table as it goes out: runs in a worker thread. */
import { type CrystalTable, columnsOf, rowsOf } from '../../physics/crystal/crystal-table.ts';
import { type AxisCoverage, axisCoverage, type QualityReport, qualityReport } from '../../physics/crystal/quality.ts';
import { coarserEdges, regridded } from '../../physics/crystal/regrid.ts';
import { KINDS, quantityOf } from '../../physics/quantity/quantity.ts';
import { tableOf } from '../crystals/crystal-record.ts';
import { lossTable } from '../crystals/given-table.ts';
import type { CrystalHeader } from '../schemas/crystal.ts';
import { DEFAULT_HALO } from '../schemas/halo.ts';
import type { Quality } from '../schemas/quality.ts';
import { haloOf } from './halos.ts';

export interface QualityJob {
  readonly header: CrystalHeader;
  readonly values: Float64Array;
  /** The unit in which the momenta were sent, where that is known: a wrong one can then be named. */
  readonly momentumUnit: string | undefined;
}

export function qualityAnswer({ header, values, momentumUnit }: QualityJob): Quality {
  const { screened, electronsPerCell, bandGapEv, energyPerPairEv } = header;
  const unit = momentumUnit === undefined ? undefined : knownUnit(momentumUnit);
  const given = tableOf(header, values);
  const whole = given.realDielectric ? lossTable(given, given.realDielectric) : given;
  const looked = overviewOf(whole, bandGapEv);
  const report = qualityReport(
    looked,
    {
      screened,
      electronsPerCell,
      bandGapEv,
      energyPerPairEv,
      ...(unit === undefined ? {} : { momentumUnit: unit }),
    },
    haloOf(DEFAULT_HALO),
  );
  return {
    verdict: report.verdict,
    findings: [
      ...report.findings.map(({ code, grade, detail }) => ({ code, grade, detail: tellable(detail) })),
      ...overviewFindings(whole, looked),
    ],
    coverage: {
      momentum: { unit: 'keV', ...coverageOut(axisCoverage(whole.axes, whole.momentumEv), 1e-3) },
      energy: { unit: 'eV', ...coverageOut(axisCoverage(whole.axes, whole.energyEv), 1) },
    },
    sumRule: sumRuleOut(report),
    onset: report.onsetEv === undefined ? null : { value: report.onsetEv, unit: 'eV' },
    opticalLimit: opticalLimitOut(report),
    roughness: { perCell: finiteOr(report.roughness.perCell), perBin: finiteOr(report.roughness.perBin) },
    masses: report.masses.map(({ mediator, fromEv, toEv, limit, lowerMomentumShare }) => ({
      mediator,
      from: { value: fromEv / 1e6, unit: 'MeV' },
      to: toEv === undefined ? null : { value: toEv / 1e6, unit: 'MeV' },
      limit: limit ?? null,
      lowerMomentumShare: finiteOr(lowerMomentumShare) ?? 0,
    })),
  };
}

/** Values up to which a report looks at every one: it costs a tenth of a second there, and its working memory grows with them. */
const MOST_VALUES = 400_000;
const OVERVIEW = { rows: 400, columns: 300 };

/** The table, or of a very large one an overview: neighbouring cells merged with their integrals kept, or of samples some. */
function overviewOf(table: CrystalTable, bandGapEv: number | undefined): CrystalTable {
  if (table.values.length <= MOST_VALUES) return table;
  if (table.axes === 'edges') {
    const momenta = coarserEdges(table.momentumEv, OVERVIEW.rows);
    return regridded(
      table,
      momenta,
      coarserEdges(table.energyEv, OVERVIEW.columns, bandGapEv === undefined ? [] : [bandGapEv]),
    );
  }
  const [rows, columns] = [someOf(rowsOf(table), OVERVIEW.rows), someOf(columnsOf(table), OVERVIEW.columns)];
  const values = Float64Array.from({ length: rows.length * columns.length }, (_, k) => {
    const [i, j] = [rows[Math.floor(k / columns.length)], columns[k % columns.length]];
    return table.values[i * columnsOf(table) + j];
  });
  return {
    ...table,
    momentumEv: Float64Array.from(rows, (i) => table.momentumEv[i]),
    energyEv: Float64Array.from(columns, (j) => table.energyEv[j]),
    values,
  };
}

/** At most `most` indices of `count`, evenly spread, the first and the last among them. */
function someOf(count: number, most: number): number[] {
  const step = Math.ceil((count - 1) / (most - 1));
  const some = Array.from({ length: Math.ceil((count - 1) / step) }, (_, k) => k * step);
  return [...some, count - 1];
}

function overviewFindings(whole: CrystalTable, looked: CrystalTable): Quality['findings'] {
  if (looked === whole) return [];
  const [from, to] = [whole, looked].map((table) => `${rowsOf(table)} × ${columnsOf(table)}`);
  const how = whole.axes === 'edges' ? 'cells merged, their integrals kept' : 'samples taken evenly';
  return [
    {
      code: 'overview',
      grade: 'fine',
      detail: `The table is very large (${from}); this report looked at ${to} of it: ${how}. Roughness is that of these.`,
    },
  ];
}

/** Names the report knows, and how they are written in a request. */
const UNITS: Readonly<Record<string, string>> = {
  eV: 'eV',
  keV: 'keV',
  '1/bohr': 'alpha m_e (1/bohr)',
  '1/angstrom': '1/angstrom',
  '1/nm': '1/nm',
};

/** The report's name of a unit, however it was written ("eV/c" is eV); undefined for one that is not among those it tries. */
function knownUnit(unit: string): string | undefined {
  const size = quantityOf(1, unit, KINDS.momentum);
  return Object.entries(UNITS).find(([name]) => Math.abs(quantityOf(1, name, KINDS.momentum) / size - 1) < 1e-9)?.[1];
}

function coverageOut({ kind, count, fromEv, toEv, stepEv }: AxisCoverage, perEv: number) {
  return {
    kind,
    count,
    from: fromEv * perEv,
    to: toEv * perEv,
    smallestStep: stepEv.smallest * perEv,
    largestStep: stepEv.largest * perEv,
  };
}

function sumRuleOut({ sumRule, electronsFound }: QualityReport): Quality['sumRule'] {
  if (!sumRule) return null;
  return {
    momentum: { unit: 'keV', values: Array.from(sumRule.momentumEv, (q) => q / 1e3) },
    share: Array.from(sumRule.share, (share) => finiteOr(share)),
    nearOne: { unit: 'keV', from: sumRule.nearOne.fromEv / 1e3, to: sumRule.nearOne.toEv / 1e3 },
    electronsFound: finiteOr(electronsFound),
  };
}

function opticalLimitOut({ opticalLimit }: QualityReport): Quality['opticalLimit'] {
  if (!opticalLimit) return null;
  const { momentumEv, staticDielectric, plasmonEv } = opticalLimit;
  return {
    momentum: { value: momentumEv / 1e3, unit: 'keV' },
    staticDielectric:
      staticDielectric && Object.values(staticDielectric).every(Number.isFinite) ? staticDielectric : null,
    plasmon: plasmonEv === undefined ? null : { value: plasmonEv, unit: 'eV' },
  };
}

/** Numbers of a table may each be sensible and their products beyond what a number holds. */
function finiteOr(value: number | undefined): number | null {
  return value !== undefined && Number.isFinite(value) ? value : null;
}

function tellable(sentence: string): string {
  return sentence.replaceAll(/NaN|-?Infinity/g, 'a number beyond all that can be held');
}
