/**
 * Rates per electron bin in a crystal (Essig, Mardon & Volansky, PRD 85, 076007 (2012); Essig et al., JHEP 05 (2016) 046):
 *
 *   dR/dE = (ρ/m_χ) (1/M_cell) σ̄ₑ α (mₑ²/μ²) ∫ dq q⁻² η(v_min) |F_DM(q)|² |f(q, E)|²,      R_n = ∫ dE P(n|E) dR/dE
 */
import { ELECTRON_MASS_EV, FINE_STRUCTURE, KILOGRAM_EV, SPEED_OF_LIGHT_KM_PER_S, YEAR_S } from '../constants.ts';
import type { CrystalTable } from '../crystal/crystal-table.ts';
import { DomainError, requirePositive } from '../errors.ts';
import { tailFrom } from '../halo/tail-cache.ts';
import type { VelocityDistribution } from '../halo/velocity-distribution.ts';
import type { IonizationModel } from '../ionization/ionization-model.ts';
import { stepEdgeEv } from '../ionization/step.ts';
import { largestEnergyEv, momentumRangeEv, reducedMassEv, smallestMassEv } from '../kinematics/kinematics.ts';
import type { Mediator } from '../mediator/mediator.ts';
import { mediatorFormFactorSquared } from '../mediator/mediator.ts';
import { energySegments } from './energy-segments.ts';
import type { RateIntegrand } from './panel-evaluator.ts';
import { rateIntegral } from './rate-integral.ts';

export interface RateScenario {
  /** m_χ, eV, > 0. */
  readonly massEv: number;
  /** σ̄ₑ, cm², > 0. */
  readonly crossSectionCm2: number;
  readonly mediator: Mediator;
  /** δ, eV; above minus the lowest energy that is counted. */
  readonly splittingEv: number;
  /** ρ_χ, GeV/cm³, > 0. */
  readonly localDensityGevPerCm3: number;
  readonly halo: VelocityDistribution;
  readonly table: CrystalTable;
  readonly ionization: IonizationModel;
  /** Width of an electron bin in energy, eV, for the edges that are reported and for error control. */
  readonly energyPerPairEv: number;
  readonly maxElectrons: number;
}

/** A number with the estimated error of its integration, relative; 0 for an exact zero. */
export interface Estimate {
  readonly value: number;
  readonly relativeError: number;
}

export interface ElectronBin {
  readonly electrons: number;
  readonly fromEv: number;
  readonly toEv: number;
  /** 1/(kg yr) */
  readonly rate: Estimate;
}

/** Where the table ends inside what the kinematics allow. */
export interface RangeCut {
  readonly axis: 'momentum' | 'energy';
  readonly end: 'lower' | 'upper';
  /** The table's end and the kinematic one, eV. */
  readonly tableEv: number;
  readonly kinematicEv: number;
  /** Share of the rate in the 5 % of the axis next to that end: how hard the cut bites. */
  readonly edgeShare: number;
}

export interface Spectrum {
  /** The table's energy axis, eV. */
  readonly energyEv: Float64Array;
  /** Mean dR/dE between neighbouring energies, 1/(kg yr eV), and the estimated relative error of each. */
  readonly values: Float64Array;
  readonly relativeErrors: Float64Array;
}

export interface CrystalRate {
  readonly bins: readonly ElectronBin[];
  /** Sum of the bins, and what lies above the last one, 1/(kg yr). */
  readonly total: Estimate;
  readonly overflow: Estimate;
  /** Events whose charge the ionization model does not place in any bin, 1/(kg yr). */
  readonly lost: Estimate;
  readonly spectrum: Spectrum | undefined;
  /** Largest energy the halo can give, eV; negative or below the gap where nothing is reached. */
  readonly largestEnergyEv: number;
  /** Smallest mass that reaches the lowest energy which frees an electron, eV. */
  readonly smallestMassEv: number;
  readonly rangeCuts: readonly RangeCut[];
}

/** Width of the strip at a table's end whose share of the rate is reported. */
const EDGE_STRIP = 0.05;

/** Events per (kg yr) for each unit of the dimensionless integral: (ρ/m_χ)(1/M_cell) σ̄ₑ α (mₑ/μ)² c · yr. */
export function rateFactor(scenario: Omit<RateScenario, 'halo'>): number {
  const numberDensity = (scenario.localDensityGevPerCm3 * 1e9) / scenario.massEv; // cm⁻³
  const cellsPerKg = KILOGRAM_EV / scenario.table.cellMassEv;
  const massRatio = ELECTRON_MASS_EV / reducedMassEv(scenario.massEv);
  const cmPerYear = SPEED_OF_LIGHT_KM_PER_S * 1e5 * YEAR_S;
  return numberDensity * cellsPerKg * scenario.crossSectionCm2 * FINE_STRUCTURE * massRatio ** 2 * cmPerYear;
}

/**
 * The lowest energy that can free an electron, eV: the gap, or where the table begins if that is above it. Throws DomainError
 * where E + δ would not stay above 0 at a momentum axis that begins at 0, or for δ ≤ −gap.
 */
export function lowestEnergyEv(table: CrystalTable, bandGapEv: number, splittingEv: number): number {
  const lowest = Math.max(bandGapEv, table.energyEv[0]);
  if (splittingEv < 0 && splittingEv <= -bandGapEv)
    throw new DomainError('massSplitting', splittingEv, `above minus the band gap, −${bandGapEv} eV`);
  if (!(lowest + splittingEv > 0) && table.momentumEv[0] === 0) {
    throw new DomainError(
      ['crystal', 'momentum'],
      0,
      'a first momentum above 0, because the energy transfer plus the mass splitting can vanish here',
    );
  }
  return lowest;
}

/**
 * Rates per bin, their sum, the overflow, and on request the spectrum on the table's energy axis (from the gap up; a cell that
 * the gap divides has the mean over the whole cell). Accuracy: see rate/rate-integral. A bin out of kinematic reach is exactly 0.
 *
 * @throws DomainError for parameters outside their domain
 */
export function crystalRate(scenario: RateScenario, wantSpectrum = false): CrystalRate {
  const { massEv, splittingEv, table, halo, ionization, energyPerPairEv, maxElectrons } = scenario;
  requirePositive('mass', massEv);
  requirePositive('referenceCrossSection', scenario.crossSectionCm2);
  requirePositive('localDensity', scenario.localDensityGevPerCm3);
  const gap = ionization.bandGapEv;
  const lowest = lowestEnergyEv(table, gap, splittingEv);
  const vMax = halo.largestSpeedKmPerS / SPEED_OF_LIGHT_KM_PER_S;
  const largest = largestEnergyEv(massEv, splittingEv, vMax);
  const tableTop = table.energyEv[table.energyEv.length - 1];
  const strips = [tableTop * (1 - EDGE_STRIP), lowest * (1 + EDGE_STRIP)];

  const binEdges = Array.from({ length: maxElectrons + 1 }, (_, i) => stepEdgeEv(gap, energyPerPairEv, i + 1));
  const cuts = [
    ...binEdges,
    ...ionization.breaksEv(gap, Math.min(tableTop, ionization.reachEv(maxElectrons))),
    ...strips,
  ];
  const segments = energySegments(table, gap, cuts, ionization.maxSegmentEv);
  const { cutsEv, count } = segments;
  const empty = count === 0 || largest <= lowest;

  const slowest = Math.sqrt((2 * Math.max(0, lowest + splittingEv)) / massEv) * SPEED_OF_LIGHT_KM_PER_S;
  const integrand: RateIntegrand = {
    table,
    segments,
    massEv,
    splittingEv,
    tail: tailFrom(halo, empty ? 0 : slowest),
    mediator: mediatorFormFactorSquared(scenario.mediator),
  };
  const groupStarts = wantSpectrum
    ? Array.from({ length: count }, (_, s) => s)
    : binEdges
        .map((e) => cutsEv.findIndex((cut) => cut >= e))
        .filter((s, i, all) => s >= 0 && s < count && s !== all[i - 1]);
  if (count > 0 && groupStarts[0] !== 0) groupStarts.unshift(0);
  const integral = empty ? undefined : rateIntegral(integrand, groupStarts, halo.largestSpeedKmPerS);

  const factor = rateFactor(scenario);
  const perSegment = (integral?.perSegment ?? new Float64Array(count)).map((value) => value * factor);
  const errors = new Float64Array(count); // absolute, per segment
  for (let g = 0; integral && g < groupStarts.length; g++) {
    for (let s = groupStarts[g]; s < (groupStarts[g + 1] ?? count); s++)
      errors[s] = Math.abs(perSegment[s]) * integral.relativeErrors[g];
  }

  const sums = new Float64Array(maxElectrons);
  const sumErrors = new Float64Array(maxElectrons);
  const weights = new Float64Array(maxElectrons);
  let [above, aboveError, lost, lostError] = [0, 0, 0, 0];
  for (let s = 0; s < count; s++) {
    if (perSegment[s] === 0) continue;
    const middle = (cutsEv[s] + cutsEv[s + 1]) / 2;
    ionization.probabilities(middle, weights);
    const error = errors[s] + ionization.segmentError * perSegment[s];
    const lostShare = ionization.lostFraction(middle);
    let rest = 1 - lostShare;
    for (let n = 0; n < maxElectrons; n++) {
      sums[n] += weights[n] * perSegment[s];
      sumErrors[n] += weights[n] * error;
      rest -= weights[n];
    }
    // a remainder of rounding is no overflow
    if (rest > 1e-12) [above, aboveError] = [above + rest * perSegment[s], aboveError + rest * error];
    [lost, lostError] = [lost + lostShare * perSegment[s], lostError + lostShare * error];
  }
  const estimate = (value: number, error: number): Estimate => ({
    value,
    relativeError: value > 0 ? error / value : 0,
  });
  const sum = (values: Iterable<number>): number => [...values].reduce((a, b) => a + b, 0);
  const total = estimate(sum(sums), sum(sumErrors));

  return {
    bins: Array.from(sums, (value, i) => ({
      electrons: i + 1,
      fromEv: binEdges[i],
      toEv: binEdges[i + 1],
      rate: estimate(value, sumErrors[i]),
    })),
    total,
    overflow: estimate(above, aboveError),
    lost: estimate(lost, lostError),
    spectrum: wantSpectrum ? spectrumOf(table, cutsEv, perSegment, errors) : undefined,
    largestEnergyEv: largest,
    smallestMassEv: smallestMassEv(lowest, splittingEv, vMax),
    rangeCuts: empty ? [] : rangeCuts(integrand, perSegment, factor, scenario, lowest, largest),
  };
}

function spectrumOf(
  table: CrystalTable,
  cutsEv: Float64Array,
  perSegment: Float64Array,
  errors: Float64Array,
): Spectrum {
  const { energyEv } = table;
  const values = new Float64Array(energyEv.length - 1);
  const absolute = new Float64Array(energyEv.length - 1);
  let j = 0;
  for (let s = 0; s < perSegment.length; s++) {
    while (energyEv[j + 1] <= cutsEv[s]) j++;
    values[j] += perSegment[s];
    absolute[j] += errors[s];
  }
  const relativeErrors = values.map((value, i) => (value > 0 ? absolute[i] / value : 0));
  return { energyEv, values: values.map((value, i) => value / (energyEv[i + 1] - energyEv[i])), relativeErrors };
}

/** The ends of the table that lie inside the kinematically allowed region, each with the share of the rate next to it. */
function rangeCuts(
  integrand: RateIntegrand,
  perSegment: Float64Array,
  factor: number,
  scenario: RateScenario,
  lowest: number,
  largest: number,
): RangeCut[] {
  const { table, massEv, splittingEv, segments } = integrand;
  const vMax = scenario.halo.largestSpeedKmPerS / SPEED_OF_LIGHT_KM_PER_S;
  const all = perSegment.reduce((a, b) => a + b, 0);
  const cuts: RangeCut[] = [];
  const shareWhere = (inside: (fromEv: number) => boolean): number =>
    all > 0 ? perSegment.reduce((part, rate, s) => (inside(segments.cutsEv[s]) ? part + rate : part), 0) / all : 0;
  const gap = scenario.ionization.bandGapEv;
  const tableTop = table.energyEv[table.energyEv.length - 1];
  if (table.energyEv[0] > gap) {
    const edgeShare = shareWhere((from) => from < lowest * (1 + EDGE_STRIP));
    cuts.push({ axis: 'energy', end: 'lower', tableEv: table.energyEv[0], kinematicEv: gap, edgeShare });
  }
  if (tableTop < largest) {
    const edgeShare = shareWhere((from) => from >= tableTop * (1 - EDGE_STRIP));
    cuts.push({ axis: 'energy', end: 'upper', tableEv: tableTop, kinematicEv: largest, edgeShare });
  }
  const allowed = momentumRangeEv(massEv, lowest + splittingEv, vMax);
  if (!allowed) return cuts;
  const [first, last] = [table.momentumEv[0], table.momentumEv[table.momentumEv.length - 1]];
  const stripShare = (fromEv: number, toEv: number): number => {
    const momenta = { fromEv: Math.max(fromEv, allowed.fromEv), toEv: Math.min(toEv, allowed.toEv) };
    if (!(all > 0 && momenta.fromEv < momenta.toEv)) return 0;
    const strip = rateIntegral(integrand, [0], scenario.halo.largestSpeedKmPerS, momenta).perSegment;
    return (strip.reduce((a, b) => a + b, 0) * factor) / all;
  };
  if (first > allowed.fromEv) {
    const edgeShare = stripShare(first, Math.min(last, first * (1 + EDGE_STRIP)));
    cuts.push({ axis: 'momentum', end: 'lower', tableEv: first, kinematicEv: allowed.fromEv, edgeShare });
  }
  if (last < allowed.toEv) {
    const edgeShare = stripShare(Math.max(first, last * (1 - EDGE_STRIP)), last);
    cuts.push({ axis: 'momentum', end: 'upper', tableEv: last, kinematicEv: allowed.toEv, edgeShare });
  }
  return cuts;
}
