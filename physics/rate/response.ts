/**
 * The halo-independent response of an experiment (P. J. Fox, J. Liu & N. Weiner, PRD 83, 103514 (2011); for electron
 * scattering M. Chen, G. B. Gelmini & V. Takhistov, JCAP 12 (2021) 048; both from memory): the rate of bin n per unit of
 * the mean inverse speed at each minimum speed,
 *
 *   R_n = ∫ K_n(v) η(v) dv,      K_n(v) = C ∫∫ dq dE q⁻² |F_DM|² |f(q, E)|² P(n|E) δ(v − v_min(q, E))
 *
 * C as in rate/crystal-rate, η in s/km. One pass over the table: at a node of a momentum panel an energy segment of
 * constant |f|² is a box in v, one of linear |f|² a ramp; K is their sum, kept by its moments (rate/speed-grid). Panels,
 * moments and segments are those of crystalRate; but the panels cannot adapt to a halo: they are finer instead.
 */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import { columnsOf, formFactorPerValue } from '../crystal/crystal-table.ts';
import { DomainError, requirePositive } from '../errors.ts';
import type { VelocityDistribution } from '../halo/velocity-distribution.ts';
import { stepEdgeEv } from '../ionization/step.ts';
import { mediatorFormFactorSquared } from '../mediator/mediator.ts';
import { lowestEnergyEv, type RateScenario, rateFactor } from './crystal-rate.ts';
import { type EnergySegments, energySegments } from './energy-segments.ts';
import { momentumPanel, NODES, panelBoundariesEv } from './momentum-panel.ts';
import { coveredMomentaEv, resolveWindows, windowsOf } from './rate-integral.ts';
import { cellMeans, integrateOver, type SpeedDeposit, type SpeedGrid, speedDeposit } from './speed-grid.ts';

export type ResponseScenario = Omit<RateScenario, 'halo'>;

export interface Response {
  /** Bins 1…maxElectrons. */
  readonly maxElectrons: number;
  /** No halo faster than this can be asked for, km/s. */
  readonly largestSpeedKmPerS: number;
  /**
   * K between the slowest speed that frees an electron and the largest; undefined where nothing in the table is reached.
   */
  readonly grid: SpeedGrid | undefined;
}

/**
 * What the halos to come are like: `smooth`, or with `steps`, η falling within a few km/s (cold and narrow streams).
 * Where η jumps, the integrand over momentum has corners and the panels must be finer.
 */
export type HaloShape = 'smooth' | 'steps';

/**
 * Bins but the first whose momentum window is narrower than this ratio, 0.1 % from the largest speed, are not worth panels
 * of their own.
 */
const WIDE_WINDOW = 1.1;
/** In how many parts panels of the lattice are cut, and how often cells of the speed grid are halved. */
const FINENESS: Record<HaloShape, { readonly parts: number; readonly halvings: number }> = {
  smooth: { parts: 2, halvings: 5 },
  steps: { parts: 8, halvings: 8 },
};

/**
 * The response up to a largest speed (km/s, below c): that of the fastest halo to come. It holds the scenario's density and
 * cross section; rates are proportional to both. Cost: about that of one crystalRate, four times that for `steps`.
 *
 * Accuracy of what it gives for a halo: see responseRates.
 *
 * @throws DomainError as crystalRate, and for a largest speed out of its domain
 */
export function response(
  scenario: ResponseScenario,
  largestSpeedKmPerS: number,
  shape: HaloShape = 'smooth',
): Response {
  const { massEv, splittingEv, table, ionization, energyPerPairEv, maxElectrons } = scenario;
  requirePositive('mass', massEv);
  requirePositive('referenceCrossSection', scenario.crossSectionCm2);
  requirePositive('localDensity', scenario.localDensityGevPerCm3);
  requirePositive('largestSpeed', largestSpeedKmPerS);
  if (largestSpeedKmPerS >= SPEED_OF_LIGHT_KM_PER_S)
    throw new DomainError('largestSpeed', largestSpeedKmPerS, 'below the speed of light');
  const { parts, halvings } = FINENESS[shape];
  const gap = ionization.bandGapEv;
  const lowest = lowestEnergyEv(table, gap, splittingEv);
  const tableTop = table.energyEv[table.energyEv.length - 1];
  const binEdges = Array.from({ length: maxElectrons + 1 }, (_, i) => stepEdgeEv(gap, energyPerPairEv, i + 1));
  const breaks = ionization.breaksEv(gap, Math.min(tableTop, ionization.reachEv(maxElectrons)));
  const segments = energySegments(table, gap, [...binEdges, ...breaks], ionization.maxSegmentEv);
  const kinematics = { table, segments, massEv, splittingEv };
  const none = { maxElectrons, largestSpeedKmPerS, grid: undefined };
  const momenta = segments.count > 0 ? coveredMomentaEv(kinematics, largestSpeedKmPerS) : undefined;
  if (!momenta) return none;

  const slowest = Math.sqrt((2 * Math.max(0, lowest + splittingEv)) / massEv) * SPEED_OF_LIGHT_KM_PER_S;
  const deposit = speedDeposit(slowest, largestSpeedKmPerS, maxElectrons, halvings);
  const binStarts = binEdges.map((e) => segments.cutsEv.findIndex((cut) => cut >= e)).filter((s) => s >= 0);
  const boundaries = resolveWindows(
    divided(panelBoundariesEv(momenta.fromEv, momenta.toEv), parts),
    windowsOf(kinematics, binStarts, largestSpeedKmPerS).filter((w, i) => i === 0 || w.toEv > WIDE_WINDOW * w.fromEv),
  );
  const addNode = nodeDeposit(scenario, segments, deposit, largestSpeedKmPerS);
  for (let i = 1; i < boundaries.length; i++) {
    const { nodesEv, moments } = momentumPanel(table, boundaries[i - 1], boundaries[i]);
    for (let k = 0; k < NODES; k++) addNode(nodesEv[k], moments.subarray(k * columnsOf(table)));
  }
  return { maxElectrons, largestSpeedKmPerS, grid: deposit.grid() };
}

function divided(boundaries: readonly number[], parts: number): number[] {
  return boundaries.flatMap((from, i) =>
    i + 1 < boundaries.length
      ? Array.from({ length: parts }, (_, p) => from + ((boundaries[i + 1] - from) * p) / parts)
      : [from],
  );
}

/** P(n|E) at the middle of each segment, and the bins, first and end, where it is not 0. */
function segmentWeights(scenario: ResponseScenario, { cutsEv, count }: EnergySegments) {
  const { maxElectrons, ionization } = scenario;
  const weights = new Float64Array(count * maxElectrons);
  const first = new Int32Array(count);
  const end = new Int32Array(count);
  for (let s = 0; s < count; s++) {
    const own = weights.subarray(s * maxElectrons, (s + 1) * maxElectrons);
    ionization.probabilities((cutsEv[s] + cutsEv[s + 1]) / 2, own);
    first[s] = own.findIndex((weight) => weight > 0);
    end[s] = maxElectrons;
    while (end[s] > 0 && !(own[end[s] - 1] > 0)) end[s]--;
    if (first[s] < 0) [first[s], end[s]] = [maxElectrons, 0];
  }
  return { weights, first, end };
}

/**
 * What a momentum node adds: at every cut between two segments K jumps from the upper end of the one below to the lower
 * end of the one above, and its slope changes. `moments` are the node's, one for each column of the table.
 */
function nodeDeposit(
  scenario: ResponseScenario,
  segments: EnergySegments,
  deposit: SpeedDeposit,
  largestSpeedKmPerS: number,
): (q: number, moments: Float64Array) => void {
  const { massEv, splittingEv, table, maxElectrons } = scenario;
  const { cutsEv, count, column, share } = segments;
  const { weights, first, end } = segmentWeights(scenario, segments);
  const linear = table.axes === 'points';
  const mediator = mediatorFormFactorSquared(scenario.mediator);
  const conversion = formFactorPerValue(table);
  const scale = rateFactor(scenario);

  return (q, moments) => {
    const perEnergy = SPEED_OF_LIGHT_KM_PER_S / q; // speed, km/s, for each eV given
    const recoil = perEnergy * splittingEv + (SPEED_OF_LIGHT_KM_PER_S * q) / (2 * massEv);
    const factor = (scale * mediator(q) * conversion(q)) / q;
    const at = (cut: number): number =>
      factor * (moments[column[cut]] + share[cut] * (moments[column[cut] + 1] - moments[column[cut]]));
    let [below, slopeBelow] = [0, 0]; // the segment below the cut: K at its upper end, dK/dv
    for (let s = 0; s <= count; s++) {
      const v = cutsEv[s] * perEnergy + recoil;
      if (!(v < largestSpeedKmPerS)) break;
      let [above, slopeAbove, upperEnd] = [0, 0, 0];
      if (s < count) {
        above = linear ? at(s) : factor * moments[column[s]];
        upperEnd = linear ? at(s + 1) : above;
        if (linear) slopeAbove = (upperEnd - above) / ((cutsEv[s + 1] - cutsEv[s]) * perEnergy);
      }
      const from = Math.min(s > 0 ? first[s - 1] : maxElectrons, s < count ? first[s] : maxElectrons);
      const to = Math.max(s > 0 ? end[s - 1] : 0, s < count ? end[s] : 0);
      for (let bin = from; bin < to; bin++) {
        const [wBelow, wAbove] = [
          s > 0 ? weights[(s - 1) * maxElectrons + bin] : 0,
          s < count ? weights[s * maxElectrons + bin] : 0,
        ];
        deposit.add(bin, v, wAbove * above - wBelow * below, wAbove * slopeAbove - wBelow * slopeBelow);
      }
      [below, slopeBelow] = [upperEnd, slopeAbove];
    }
  };
}

/**
 * R_n, 1/(kg yr), for bins 1…maxElectrons and a halo. Exactly 0 out of the halo's reach. Cost: a hundred evaluations of
 * η, 10 to 30 µs for the standard halo; a thousand for one with as many kinks.
 *
 * Accuracy: within 1e-4 of crystalRate, typically 1e-6, for every bin above 1e-6 of the total, if its threshold lies at
 * least 1 % of the grid's range below the halo's largest speed; for cold streams with `steps` 2e-4, with `smooth` 2e-3
 * (test/physics/rate/response.test.ts: 20 halos, three mediators, five masses).
 *
 * @throws DomainError for a halo faster than the response's largest speed
 */
export function responseRates(
  { grid, maxElectrons, largestSpeedKmPerS }: Response,
  halo: VelocityDistribution,
  out = new Float64Array(maxElectrons),
): Float64Array {
  if (!(halo.largestSpeedKmPerS <= largestSpeedKmPerS))
    throw new DomainError('halo', halo.largestSpeedKmPerS, `a largest speed of at most ${largestSpeedKmPerS} km/s`);
  if (grid) integrateOver(grid, halo, out);
  else out.fill(0);
  return out;
}

export interface ResponseKernel {
  /** Edges of the cells, km/s, ascending. */
  readonly speedEdgesKmPerS: Float64Array;
  /** Per bin the mean of K_n over each cell: rate in 1/(kg yr) for each (s/km) of η and km/s of width. */
  readonly kernels: readonly Float64Array[];
}

/** K_n as numbers, for halo-independent work elsewhere: R_n ≈ Σ_cells K_n ∫_cell η dv. Empty where nothing is reached. */
export function responseKernel({ grid }: Response): ResponseKernel {
  if (!grid) return { speedEdgesKmPerS: new Float64Array(0), kernels: [] };
  const { edgesKmPerS, means } = cellMeans(grid);
  return { speedEdgesKmPerS: edgesKmPerS, kernels: means };
}
