/**
 * Two tables, one scenario: how the rates differ bin by bin, and in which region of momentum and energy the difference is made.
 * The plane is cut into blocks, momenta in equal ratios, energies at the electron bins; what a block adds to the rate is its part of
 * the same integral (rate/rate-integral), so that the blocks add up to the rates.
 */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import { tailFrom } from '../halo/tail-cache.ts';
import { stepEdgeEv } from '../ionization/step.ts';
import { mediatorFormFactorSquared } from '../mediator/mediator.ts';
import { crystalRate, type Estimate, lowestEnergyEv, type RateScenario } from '../rate/crystal-rate.ts';
import { energySegments } from '../rate/energy-segments.ts';
import type { RateIntegrand } from '../rate/panel-evaluator.ts';
import { coveredMomentaEv, rateIntegral } from '../rate/rate-integral.ts';
import type { CrystalTable } from './crystal-table.ts';

export interface ComparedBin {
  readonly electrons: number;
  readonly fromEv: number;
  readonly toEv: number;
  /** 1/(kg yr) */
  readonly baseline: Estimate;
  readonly candidate: Estimate;
  /** Candidate over baseline; undefined where the baseline has none. */
  readonly ratio: number | undefined;
}

export interface Block {
  readonly momentumEv: { readonly from: number; readonly to: number };
  readonly energyEv: { readonly from: number; readonly to: number };
  /** Rates from this block, 1/(kg yr), of all energies above the gap, whatever charge they free. */
  readonly baseline: number;
  readonly candidate: number;
  /** (candidate − baseline) over the baseline's whole rate above the gap; over the candidate's if the baseline has none. */
  readonly difference: number;
}

export interface TableComparison {
  readonly bins: readonly ComparedBin[];
  /** Whole rates above the gap, 1/(kg yr), and their ratio; undefined where the baseline has none. */
  readonly baseline: number;
  readonly candidate: number;
  readonly ratio: number | undefined;
  /** Blocks that make a difference, the largest first. */
  readonly blocks: readonly Block[];
}

/** Blocks in momentum. */
const MOMENTUM_BLOCKS = 12;
/** Blocks in energy at most: bins above it go into one. */
const MOST_ENERGY_BLOCKS = 20;

/** A table's rate above the gap, 1/(kg yr), and what is needed to find its parts. */
interface Side {
  readonly integrand: RateIntegrand;
  readonly momenta: { readonly fromEv: number; readonly toEv: number } | undefined;
  readonly rate: ReturnType<typeof crystalRate>;
  readonly whole: number;
}

/**
 * Compares `candidate` with `baseline` under a scenario (whose own gap holds for both). Blocks add up to the whole rates within the
 * error of the integration, 2e-4 (test/physics/crystal/table-comparison.test.ts).
 *
 * @throws DomainError as `crystalRate`
 */
export function compareTables(
  scenario: Omit<RateScenario, 'table'>,
  baseline: CrystalTable,
  candidate: CrystalTable,
): TableComparison {
  const energies = energyBlocks(scenario, baseline, candidate);
  const sides = [baseline, candidate].map((table) => sideOf({ ...scenario, table }, energies));
  const [base, other] = sides;
  const momenta = momentumBlocks(sides);
  const [baseParts, otherParts] = sides.map((side) => blockRates(side, scenario, energies, momenta));
  const whole = base.whole > 0 ? base.whole : other.whole;
  const blocks = baseParts.flatMap((row, i) =>
    row.map((value, j) => ({
      momentumEv: { from: momenta[i], to: momenta[i + 1] },
      energyEv: { from: energies[j], to: energies[j + 1] },
      baseline: value,
      candidate: otherParts[i][j],
      difference: whole > 0 ? (otherParts[i][j] - value) / whole : 0,
    })),
  );
  return {
    bins: base.rate.bins.map(({ electrons, fromEv, toEv, rate }, n) => ({
      electrons,
      fromEv,
      toEv,
      baseline: rate,
      candidate: other.rate.bins[n].rate,
      ratio: rate.value > 0 ? other.rate.bins[n].rate.value / rate.value : undefined,
    })),
    baseline: base.whole,
    candidate: other.whole,
    ratio: base.whole > 0 ? other.whole / base.whole : undefined,
    blocks: blocks
      .filter(({ difference }) => difference !== 0)
      .sort((a, b) => Math.abs(b.difference) - Math.abs(a.difference)),
  };
}

/** Energies that divide the plane: bin edges from the gap to the higher of the tables' last energies. */
function energyBlocks(
  { ionization, energyPerPairEv, maxElectrons }: Omit<RateScenario, 'table'>,
  ...tables: readonly CrystalTable[]
): number[] {
  const top = Math.max(...tables.map(({ energyEv }) => energyEv[energyEv.length - 1]));
  const count = Math.min(maxElectrons, MOST_ENERGY_BLOCKS);
  const edges = Array.from({ length: count }, (_, i) => stepEdgeEv(ionization.bandGapEv, energyPerPairEv, i + 1));
  return [...edges.filter((edge) => edge < top), top];
}

/** Momenta that divide the plane, in equal ratios over what both tables cover together; empty where neither can be reached. */
function momentumBlocks(sides: readonly Side[]): number[] {
  const ranges = sides.flatMap(({ momenta }) => momenta ?? []);
  if (ranges.length === 0) return [];
  const from = Math.min(...ranges.map(({ fromEv }) => fromEv));
  const to = Math.max(...ranges.map(({ toEv }) => toEv));
  const inside = Array.from(
    { length: MOMENTUM_BLOCKS - 1 },
    (_, i) => from * (to / from) ** ((i + 1) / MOMENTUM_BLOCKS),
  );
  return [from, ...inside, to];
}

function sideOf(scenario: RateScenario, energies: readonly number[]): Side {
  const { table, halo, massEv, splittingEv, ionization } = scenario;
  const rate = crystalRate(scenario);
  const lowest = lowestEnergyEv(table, ionization.bandGapEv, splittingEv);
  const isReached = rate.largestEnergyEv > lowest;
  const slowest = Math.sqrt((2 * Math.max(0, lowest + splittingEv)) / massEv) * SPEED_OF_LIGHT_KM_PER_S;
  const integrand: RateIntegrand = {
    table,
    segments: energySegments(table, ionization.bandGapEv, energies, Infinity),
    massEv,
    splittingEv,
    tail: tailFrom(halo, isReached ? slowest : 0),
    mediator: mediatorFormFactorSquared(scenario.mediator),
  };
  const hasSegments = integrand.segments.count > 0;
  const momenta = isReached && hasSegments ? coveredMomentaEv(integrand, halo.largestSpeedKmPerS) : undefined;
  return { integrand, momenta, rate, whole: rate.total.value + rate.overflow.value + rate.lost.value };
}

/** Rates of every block, [momentum][energy], scaled so that the table's own blocks add up to its whole rate. */
function blockRates(
  { integrand, momenta, whole }: Side,
  { halo }: Omit<RateScenario, 'table'>,
  energies: readonly number[],
  limits: readonly number[],
): number[][] {
  const { cutsEv, count } = integrand.segments;
  const blockOf = Array.from({ length: count }, (_, s) => energies.findLastIndex((edge) => edge <= cutsEv[s]));
  const starts = Array.from(blockOf.keys()).filter((s) => s === 0 || blockOf[s] !== blockOf[s - 1]);
  const parts = limits.slice(1).map((to, i) => {
    const row = new Array<number>(energies.length - 1).fill(0);
    if (!momenta) return row;
    const range = { fromEv: Math.max(limits[i], momenta.fromEv), toEv: Math.min(to, momenta.toEv) };
    if (!(range.fromEv < range.toEv)) return row;
    const { perSegment } = rateIntegral(integrand, starts, halo.largestSpeedKmPerS, range);
    perSegment.forEach((part, s) => {
      row[Math.min(blockOf[s], row.length - 1)] += part;
    });
    return row;
  });
  const sum = parts.flat().reduce((a, b) => a + b, 0);
  return parts.map((row) => row.map((part) => (sum > 0 ? (part / sum) * whole : 0)));
}
