/**
 * The quality report: what a table must satisfy whoever made it, asked of the table, with a verdict. Every finding is a code, a
 * grade and one sentence with its numbers. Nothing here changes the table.
 *
 *   fine    as it should be
 *   look    may be right; a reader should know
 *   wrong   cannot be right as it is described: do not believe rates from it
 */
import { ELECTRON_MASS_EV, REFERENCE_MOMENTUM_EV, SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import type { VelocityDistribution } from '../halo/velocity-distribution.ts';
import { median } from '../numeric/median.ts';
import type { AxisKind, CrystalTable } from './crystal-table.ts';
import { columnsOf, rowsOf } from './crystal-table.ts';
import type { MassCoverage } from './mass-coverage.ts';
import { HEAVIEST_EV, massCoverage } from './mass-coverage.ts';
import type { OpticalLimit } from './optical-limit.ts';
import { opticalLimit } from './optical-limit.ts';
import { cellNoise } from './roughness.ts';
import { energyMoments, type SumRule, sumRule } from './sum-rule.ts';
import type { AxisScore, Demands, UnitReading } from './unit-fit.ts';
import { axesFit, axisScore, demandsOf, fittingUnits, isOnRidge, plasmaEnergyEv } from './unit-fit.ts';

export type Grade = 'fine' | 'look' | 'wrong';

export type FindingCode =
  | 'values'
  | 'axes'
  | 'sum-rule'
  | 'units'
  | 'strength-above'
  | 'electrons'
  | 'onset'
  | 'screening'
  | 'static-dielectric'
  | 'plasmon'
  | 'roughness'
  | 'masses';

export interface Finding {
  readonly code: FindingCode;
  readonly grade: Grade;
  /** One sentence with its numbers and units. */
  readonly detail: string;
}

/** What is said of a table beside its numbers. */
export interface TableClaims {
  readonly screened: boolean;
  readonly electronsPerCell: number | undefined;
  readonly bandGapEv: number | undefined;
  readonly energyPerPairEv: number | undefined;
  /** The unit in which momenta were given, where known: see `fittingUnits`. */
  readonly momentumUnit?: string;
}

export interface AxisCoverage {
  readonly kind: AxisKind;
  readonly count: number;
  readonly fromEv: number;
  readonly toEv: number;
  /** Narrowest and widest step, eV. */
  readonly stepEv: { readonly smallest: number; readonly largest: number };
}

export interface QualityReport {
  readonly verdict: Grade;
  readonly findings: readonly Finding[];
  readonly momentum: AxisCoverage;
  readonly energy: AxisCoverage;
  /** Absent where the electrons per cell are not given. */
  readonly sumRule: SumRule | undefined;
  /** Electrons per cell that the strength below the last energy comes to, where the sum rule should hold; undefined where it should nowhere. */
  readonly electronsFound: number | undefined;
  /** Lower end of the first energy with strength, eV; undefined for an empty table. */
  readonly onsetEv: number | undefined;
  /** Absent where it cannot be read: no cell volume, or no reliable row at small momentum. */
  readonly opticalLimit: OpticalLimit | undefined;
  /** Relative noise of a cell, and roughly what is left of it in the rate of one electron bin. */
  readonly roughness: { readonly perCell: number; readonly perBin: number | undefined };
  /** Empty where rates make no sense: no strength, or a wrong unit. */
  readonly masses: readonly MassCoverage[];
}

/** Everything the findings are made of, computed once. */
interface Facts {
  readonly table: CrystalTable;
  readonly claims: TableClaims;
  readonly electrons: number;
  readonly rule: SumRule;
  readonly score: AxisScore;
  readonly readings: readonly UnitReading[];
  readonly topEv: number;
  readonly onsetEv: number;
}

/** Median share of the f-sum rule from which on a table is worth a look, or is wrong. */
const HIGH_SHARE = 1.05;
const WRONG_SHARE = 1.1;
/** Shares below which something is left above the table, and below which a unit that fits better is believed. */
const LOW_SHARE = 0.8;
const SMALLEST_SHARE = 0.25;
/** Electrons per cell not given: the share is of all electrons of the cell's atoms, and valence alone is as little as this. */
const SMALLEST_SHARE_OF_ALL = 0.03;
/** Mass of a cell for each of its electrons, eV, near enough: two nucleons. */
const MASS_PER_ELECTRON_EV = 1.9e9;
/** Strength below this part of a row's largest value is none. */
const NO_STRENGTH = 1e-9;
/** (2/π) ∫ L/E dE = 1 − 1/ε(0) < 1 for every loss function, and for Im ε it is ε(0) − 1; a little is left for errors. */
const LARGEST_LOSS_INTEGRAL = 1.02;
/** No crystal with a gap below this has a static ε below 2. */
const SMALL_GAP_EV = 6;
const LARGE_NOISE = 0.3;
const LARGE_BIN_NOISE = 0.03;
/** A mass that every plan looks at: coverage that ends below it is worth a look. */
const COMMON_MASS_EV = 1e8;
/** Share of the rate next to the first momentum that is worth a look. */
const LARGE_EDGE_SHARE = 0.01;

const GRADES: readonly Grade[] = ['fine', 'look', 'wrong'];

/**
 * The report of a table. `halo` is the standard halo against which masses are judged. Takes up to seventy rates
 * and one Kramers–Kronig row.
 *
 * Built-in tables, scaled tables and analytic ones: test/physics/crystal/quality.test.ts.
 *
 * @throws DomainError for electronsPerCell not above 0
 */
export function qualityReport(table: CrystalTable, claims: TableClaims, halo: VelocityDistribution): QualityReport {
  const electrons = claims.electronsPerCell ?? Math.max(1, table.cellMassEv / MASS_PER_ELECTRON_EV);
  const smallest = claims.electronsPerCell === undefined ? SMALLEST_SHARE_OF_ALL : SMALLEST_SHARE;
  const rule = sumRule(table, electrons);
  const score = axisScore(table, rule, electrons);
  const demands = demandsOf(table, electrons, smallest);
  const onset = onsetEv(table);
  const evidence = {
    table,
    rule,
    electronsPerCell: electrons,
    smallestShare: smallest,
    onsetEv: onset,
    bandGapEv: claims.bandGapEv,
    momentumUnit: claims.momentumUnit,
  };
  const facts: Facts = {
    table,
    claims,
    electrons,
    rule,
    score,
    readings: axesFit(score, demands) ? [] : fittingUnits(evidence),
    topEv: table.energyEv[table.energyEv.length - 1],
    onsetEv: onset,
  };
  const limit = opticalLimit(table, claims.screened, claims.electronsPerCell);
  const gap = claims.bandGapEv ?? facts.onsetEv;
  const perCell = cellNoise(table, gap);
  const perBin = binNoise(facts, gap, perCell, halo);
  const makesSense = facts.readings.length === 0 && gap < facts.topEv && (gap > 0 || table.momentumEv[0] > 0);
  const masses = makesSense ? (['heavy', 'light'] as const).map((m) => massCoverage(table, m, gap, halo)) : [];

  const findings = [
    ...valueFindings(facts),
    ...axisFindings(facts),
    ...sumRuleFindings(facts),
    ...ridgeFindings(facts, demands),
    ...onsetFindings(facts),
    ...opticalFindings(facts, limit),
    ...roughnessFindings(perCell, perBin),
    ...masses.flatMap((mass) => massFindings(mass)),
  ];
  return {
    verdict: GRADES[Math.max(0, ...findings.map(({ grade }) => GRADES.indexOf(grade)))],
    findings,
    momentum: axisCoverage(table.axes, table.momentumEv),
    energy: axisCoverage(table.axes, table.energyEv),
    sumRule: claims.electronsPerCell === undefined ? undefined : rule,
    electronsFound: score.rows > 0 ? score.share * electrons : undefined,
    onsetEv: Number.isFinite(facts.onsetEv) ? facts.onsetEv : undefined,
    opticalLimit: limit,
    roughness: { perCell, perBin },
    masses,
  };
}

/** What an axis covers. */
export function axisCoverage(kind: AxisKind, axis: Float64Array): AxisCoverage {
  const steps = axis.subarray(1).map((x, i) => x - axis[i]);
  const stepEv = { smallest: steps.reduce((a, b) => Math.min(a, b)), largest: steps.reduce((a, b) => Math.max(a, b)) };
  return { kind, count: axis.length, fromEv: axis[0], toEv: axis[axis.length - 1], stepEv };
}

/** Lower end of the first energy cell (for points, the sample before the first) with strength; Infinity where there is none. */
function onsetEv(table: CrystalTable): number {
  const columns = columnsOf(table);
  let onset = columns;
  for (let i = 0; i < rowsOf(table); i++) {
    const row = table.values.subarray(i * columns, (i + 1) * columns);
    const threshold = NO_STRENGTH * row.reduce((a, b) => Math.max(a, b), 0);
    const first = row.findIndex((value) => value > threshold);
    if (first >= 0) onset = Math.min(onset, first);
  }
  if (onset === columns) return Number.POSITIVE_INFINITY;
  return table.energyEv[table.axes === 'edges' ? onset : Math.max(0, onset - 1)];
}

function valueFindings({ table, onsetEv }: Facts): Finding[] {
  const bad = table.values.reduce((count, value) => (value >= 0 && value < Infinity ? count : count + 1), 0);
  if (bad > 0) {
    const detail = `${bad} of ${table.values.length} values are negative or not finite; a response is at least 0.`;
    return [{ code: 'values', grade: 'wrong', detail }];
  }
  if (onsetEv === Infinity) return [{ code: 'values', grade: 'wrong', detail: 'Every value is 0.' }];
  return [];
}

function axisFindings({ table, claims, topEv }: Facts): Finding[] {
  const { energyEv, momentumEv } = table;
  const findings: Finding[] = [
    {
      code: 'axes',
      grade: 'fine',
      detail: `${rowsOf(table)} momenta from ${keV(momentumEv[0])} to ${keV(momentumEv[momentumEv.length - 1])} keV and ${columnsOf(table)} energies from ${shown(energyEv[0])} to ${shown(topEv)} eV.`,
    },
  ];
  const pair = claims.energyPerPairEv;
  const widest = axisCoverage(table.axes, energyEv).stepEv.largest;
  if (pair !== undefined && widest > pair / 2) {
    const detail = `Energy steps of up to ${shown(widest)} eV are wide for electron bins of ${shown(pair)} eV: a bin has fewer than two.`;
    findings.push({ code: 'axes', grade: 'look', detail });
  }
  return findings;
}

function sumRuleFindings(facts: Facts): Finding[] {
  const { claims, score, rule, topEv, readings } = facts;
  const given = claims.electronsPerCell;
  const rangeText = `below ${keV(rule.nearOne.toEv)} keV (${shown(rule.nearOne.toEv / REFERENCE_MOMENTUM_EV)} alpha m_e)`;
  const ofText =
    given === undefined ? `all ${shown(facts.electrons)} electrons of the cell` : `${shown(given)} electrons`;
  if (readings.length > 0) return [unitFinding(facts, readings, ofText, rangeText)];
  if (score.rows < 2) {
    const detail = `The f-sum rule cannot be checked: fewer than two momenta lie ${rangeText}, where electrons respond below ${shown(topEv)} eV.`;
    return [{ code: 'sum-rule', grade: 'look', detail }];
  }
  if (given === undefined) {
    const isTooMuch = score.share > WRONG_SHARE;
    const most = isTooMuch ? `, more than all ${shown(facts.electrons)} that its atoms have` : '';
    const detail = `Without electronsPerCell the f-sum rule is half a test: below ${shown(topEv)} eV the strength comes to ${shown(score.share * facts.electrons)} electrons per cell${most}.`;
    return [{ code: 'electrons', grade: isTooMuch ? 'wrong' : 'look', detail }];
  }
  const inside = rule.share.filter((_, i) => rule.momentumEv[i] <= rule.nearOne.toEv);
  const [low, high] = [inside.reduce((a, b) => Math.min(a, b)), inside.reduce((a, b) => Math.max(a, b))];
  const range = `${shown(low)} to ${shown(high)}, median ${shown(score.share)}, for momenta ${rangeText}`;
  const head = `The f-sum share of ${ofText} below ${shown(topEv)} eV is ${range}`;
  if (score.share > WRONG_SHARE) {
    const detail = `${head}: more strength than the electrons have, and no other unit of the axes explains it; check electronsPerCell and the normalisation.`;
    return [{ code: 'sum-rule', grade: 'wrong', detail }];
  }
  if (score.share > HIGH_SHARE)
    return [{ code: 'sum-rule', grade: 'look', detail: `${head}: a few per cent above 1.` }];
  if (score.share < LOW_SHARE) return [{ code: 'strength-above', grade: 'look', detail: `${head}: ${whyLow(facts)}` }];
  return [{ code: 'sum-rule', grade: 'fine', detail: `${head}: near 1, as it should be.` }];
}

function unitFinding(
  { score, topEv }: Facts,
  [best, ...others]: readonly UnitReading[],
  ofText: string,
  rangeText: string,
): Finding {
  const { axis, said, fits, factor, share } = best;
  const also = others.map((other) => `${other.fits} for ${other.said} of ${other.axis} (share ${shown(other.share)})`);
  const alsoText = also.length > 0 ? `; less likely, ${also.join(' or ')}` : '';
  const asGiven =
    score.rows > 0
      ? `As given, the f-sum share of ${ofText} below ${shown(topEv)} eV is ${shown(score.share)} for momenta ${rangeText}`
      : `As given, no momentum lies ${rangeText}, where electrons respond below ${shown(topEv)} eV`;
  const detail = `${asGiven}; read in ${fits} instead of ${said} the ${axis} axis would be ${shown(factor)} times what it is and the share ${shown(share)}, so ${fits} is the unit that would fit${alsoText}.`;
  return { code: 'units', grade: 'wrong', detail };
}

/** No unit fits and yet the strength leaves the table at the wrong momentum. */
function ridgeFindings({ score, readings, topEv }: Facts, demands: Demands): Finding[] {
  if (readings.length > 0 || isOnRidge(score, demands)) return [];
  const ridgeEv = Math.sqrt(2 * ELECTRON_MASS_EV * topEv);
  const detail = `Half of the strength below ${shown(topEv)} eV is gone at ${keV(score.ridge! * ridgeEv)} keV, but electrons leave these energies near q = sqrt(2 m_e E), ${keV(ridgeEv)} keV.`;
  return [{ code: 'units', grade: 'look', detail }];
}

/** Part of the energy axis below its end in which strength must still be rising if there is more above. */
const TOP_TENTH = 0.1;

/** Why a share is low. Strength just below the table's end speaks for strength above it: a shell that opens there. */
function whyLow({ table, rule, electrons, score, topEv }: Facts): string {
  const first = table.energyEv.findIndex((energy) => energy >= topEv * (1 - TOP_TENTH));
  const top = energyMoments(table, table.values, first);
  const all = energyMoments(table);
  const parts = Array.from(all.subarray(0, rule.share.length), (moment, i) => (moment > 0 ? top[i] / moment : 0));
  const part = median(parts.filter((_, i) => rule.momentumEv[i] <= rule.nearOne.toEv));
  const counts = `as much as ${shown(score.share * electrons)} of the ${shown(electrons)} electrons can give, and the rest lies above ${shown(topEv)} eV if the table is right`;
  const percent = `${shown(100 * part)} % of what is there lies in the last tenth of the energies`;
  const plasmaEv = plasmaEnergyEv(table, electrons);
  if (topEv < 1.2 * plasmaEv)
    return `${counts}; the table ends near or below the plasma energy of its electrons, ${shown(plasmaEv)} eV, where most of the response lies.`;
  return part > TOP_TENTH / 3
    ? `${counts}; ${percent}, so strength does go on beyond the table, as where shells (3d) open shortly below its end; rates above ${shown(topEv)} eV are missing.`
    : `${counts}; but only ${percent}, so check electronsPerCell and the normalisation.`;
}

function onsetFindings({ table, claims, onsetEv, topEv }: Facts): Finding[] {
  const gap = claims.bandGapEv;
  if (gap === undefined || onsetEv === Infinity) return [];
  const step = table.energyEv[1] - table.energyEv[0];
  const onset = `The lowest energy with strength is ${shown(onsetEv)} eV, the band gap ${shown(gap)} eV`;
  if (gap >= topEv) return [{ code: 'onset', grade: 'wrong', detail: `${onset}, above the whole table.` }];
  if (onsetEv < gap - Math.max(step, 0.1))
    return [{ code: 'onset', grade: 'look', detail: `${onset}: what lies below the gap is not counted.` }];
  if (onsetEv > gap + Math.max(1, 0.3 * gap))
    return [{ code: 'onset', grade: 'look', detail: `${onset}: the first electronvolts above the gap are empty.` }];
  return [{ code: 'onset', grade: 'fine', detail: `${onset}.` }];
}

function opticalFindings({ claims, readings }: Facts, limit: OpticalLimit | undefined): Finding[] {
  if (!limit || readings.length > 0) return [];
  const at = `at ${keV(limit.momentumEv)} keV`;
  const { staticIntegral, staticDielectric, plasmonEv } = limit;
  if (claims.screened && staticIntegral > LARGEST_LOSS_INTEGRAL) {
    const detail = `Said to be screened, but (2/pi) int Im(-1/eps)/E dE is ${shown(staticIntegral)} ${at}, and no loss function comes to more than 1; as unscreened numbers they give a static eps of ${shown(1 + staticIntegral)}.`;
    return [{ code: 'screening', grade: 'wrong', detail }];
  }
  const findings: Finding[] = [];
  if (!claims.screened && staticIntegral < 1 && claims.bandGapEv !== undefined && claims.bandGapEv < SMALL_GAP_EV) {
    const screened = `as screened numbers they give ${shown(1 / (1 - staticIntegral))}`;
    const detail = `Said to be unscreened, but the static eps ${at} would be ${shown(1 + staticIntegral)}, small for a gap of ${shown(claims.bandGapEv)} eV; ${screened}.`;
    findings.push({ code: 'screening', grade: 'look', detail });
  }
  if (staticDielectric) {
    const { value, from, to } = staticDielectric;
    const range = to - from > 0.02 * value ? ` (${shown(from)} to ${shown(to)} for the strength above the table)` : '';
    const detail = `The static dielectric constant from Kramers-Kronig ${at} is ${shown(value)}${range}.`;
    findings.push({ code: 'static-dielectric', grade: 'fine', detail });
  }
  if (plasmonEv !== undefined)
    findings.push({
      code: 'plasmon',
      grade: 'fine',
      detail: `The loss function peaks at ${shown(plasmonEv)} eV ${at}.`,
    });
  return findings;
}

/** Roughly the noise of one electron bin: that of a cell over the root of the number of cells that feed the second bin. */
function binNoise(
  { table, claims }: Facts,
  gapEv: number,
  perCell: number,
  halo: VelocityDistribution,
): number | undefined {
  const pair = claims.energyPerPairEv;
  if (pair === undefined) return undefined;
  const [from, to] = [gapEv + pair, gapEv + 2 * pair];
  // slowest halo particles that can give this energy, and the momenta in which the halo and q⁻² leave most of the rate
  const smallest = (SPEED_OF_LIGHT_KM_PER_S * (from + to)) / 2 / halo.largestSpeedKmPerS;
  const within = (axis: Float64Array, a: number, b: number): number => axis.filter((x) => x >= a && x < b).length;
  const cells = within(table.energyEv, from, to) * within(table.momentumEv, smallest, 3 * smallest);
  return cells > 0 ? perCell / Math.sqrt(cells) : undefined;
}

function roughnessFindings(perCell: number, perBin: number | undefined): Finding[] {
  const rates =
    perBin === undefined
      ? ''
      : `; if cells are independent, about ${shown(100 * perBin)} % of noise is left in the rate of a bin, and more if they were smoothed together`;
  const isRough = perCell > LARGE_NOISE || (perBin ?? 0) > LARGE_BIN_NOISE;
  const detail = `Neighbouring cells scatter by ${shown(100 * perCell)} % (median)${rates}.`;
  return [{ code: 'roughness', grade: isRough ? 'look' : 'fine', detail }];
}

function massFindings({ mediator, fromEv, toEv, limit, lowerMomentumShare }: MassCoverage): Finding[] {
  const upTo = toEv === undefined ? `${MeV(HEAVIEST_EV)} MeV and beyond` : `${MeV(toEv)} MeV`;
  const why = toEv === undefined ? '' : `; from there on part of the rate lies above its last ${limit}`;
  const findings: Finding[] = [
    {
      code: 'masses',
      grade: toEv !== undefined && toEv < COMMON_MASS_EV ? 'look' : 'fine',
      detail: `With a ${mediator} mediator the table covers what the halo allows for masses from ${MeV(fromEv)} to ${upTo}${why}.`,
    },
  ];
  if (lowerMomentumShare > LARGE_EDGE_SHARE) {
    const detail = `With a ${mediator} mediator up to ${shown(100 * lowerMomentumShare)} % of the rate lies next to the first momentum, where the halo allows smaller ones.`;
    findings.push({ code: 'masses', grade: 'look', detail });
  }
  return findings;
}

/** Three significant digits are all a sentence needs. */
function shown(value: number): string {
  return String(Number(value.toPrecision(3)));
}

function keV(valueEv: number): string {
  return shown(valueEv / 1e3);
}

function MeV(valueEv: number): string {
  return shown(valueEv / 1e6);
}
