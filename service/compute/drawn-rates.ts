/**
 * Rates per true electron for many draws of a scenario's parameters: one response, and for each draw its halo, its band
 * gap and pair energy (through a ladder of energy steps) and its density.
 */
import { type EnergyLadder, ladderBinning, ladderScenario, MOST_STEPS } from '../../physics/rate/energy-ladder.ts';
import { type Response, response, responseRates } from '../../physics/rate/response.ts';
import type { ParameterName } from '../schemas/uncertainty.ts';
import { ionizationModelOf } from './detector-view.ts';
import { speedBoundKmPerS } from './drawn-scenario.ts';
import type { RatesJob } from './rates-answer.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';
import { requireBelowLight, responseOf, responseScenarioOf } from './response-scenario.ts';
import { distributionOf, shapeOf } from './velocity-distributions.ts';

/** Width of the ladder's steps, eV, or what fits into as many as there may be. */
const STEP_EV = 0.05;
/** The bound must not be below the halo's own largest speed for a rounding. */
const ABOVE_ROUNDING = 1 + 1e-12;

const HALO_PARAMETERS: ReadonlySet<ParameterName> = new Set(['circularSpeed', 'escapeSpeed', 'laboratorySpeed']);
const IONIZATION_PARAMETERS: ReadonlySet<ParameterName> = new Set(['bandGap', 'energyPerPair']);

/** Bins 1…lastElectron, 1/(kg yr), one row for each of the drawn scenarios. */
export function drawnRates(
  job: RatesJob,
  drawn: readonly ResolvedScenario[],
  names: readonly ParameterName[],
  lastElectron: number,
): Float64Array[] {
  const { scenario } = job;
  const isHaloDrawn = names.some((name) => HALO_PARAMETERS.has(name));
  const largest = drawn.reduce(
    (most, { halo }) => Math.max(most, speedBoundKmPerS(halo)),
    speedBoundKmPerS(scenario.halo),
  );
  requireBelowLight(largest * ABOVE_ROUNDING, '');
  const ladder = names.some((name) => IONIZATION_PARAMETERS.has(name))
    ? ladderFor(job, drawn, lastElectron)
    : undefined;
  const fastest = largest * ABOVE_ROUNDING;
  const shape = shapeOf(scenario.halo);
  const kernel = ladder
    ? response(ladderScenario(responseScenarioOf(job, lastElectron), ladder), fastest, shape)
    : responseOf(job, lastElectron, fastest, shape);
  const rates = ratesByHalo(kernel, isHaloDrawn ? undefined : scenario);
  const binning = ladder && ladderBinning(ladder);
  return drawn.map((one) => {
    const perBin = rates(one);
    const bins = binning ? binning(perBin, ionizationModelOf(one.ionization), lastElectron) : perBin;
    const density = one.halo.localDensityGevPerCm3 / scenario.halo.localDensityGevPerCm3;
    return bins.map((rate) => rate * density);
  });
}

/** A response's rates; of a halo that is always the same they are computed once. */
function ratesByHalo(kernel: Response, always: ResolvedScenario | undefined): (one: ResolvedScenario) => Float64Array {
  if (!always) return ({ halo }) => responseRates(kernel, distributionOf(halo));
  const rates = responseRates(kernel, distributionOf(always.halo));
  return () => rates;
}

/** From the lowest gap to the table's end, or to the last energy that can feed a bin. */
function ladderFor({ table }: RatesJob, drawn: readonly ResolvedScenario[], lastElectron: number): EnergyLadder {
  const largestOf = (of: (one: ResolvedScenario) => number): number =>
    drawn.reduce((most, one) => Math.max(most, of(one)), 0);
  const fromEv = drawn.reduce((least, { ionization }) => Math.min(least, ionization.bandGapEv), Infinity);
  const widest = {
    ...drawn[0].ionization,
    bandGapEv: largestOf(({ ionization }) => ionization.bandGapEv),
    energyPerPairEv: largestOf(({ ionization }) => ionization.energyPerPairEv),
  };
  const toEv = Math.min(table.energyEv[table.energyEv.length - 1], ionizationModelOf(widest).reachEv(lastElectron));
  const range = Math.max(toEv - fromEv, STEP_EV);
  const steps = Math.min(MOST_STEPS, Math.ceil(range / STEP_EV));
  return { fromEv, stepEv: range / steps, steps };
}
