/**
 * Rates on a ladder of narrow energy steps, for ionization parameters that vary as fast as the halo does: the response is
 * made once with the steps for bins, and what a drawn band gap or energy per pair makes of the steps' rates is a small
 * matrix product,
 *
 *   R_n = Σ_steps R_step ⟨P(n|E)⟩,    the mean over the step, dR/dE taken constant in it.
 */
import { DomainError, requireNonNegative, requirePositive } from '../errors.ts';
import type { IonizationModel } from '../ionization/ionization-model.ts';
import { stepEdgeEv } from '../ionization/step.ts';
import type { ResponseScenario } from './response.ts';

export interface EnergyLadder {
  readonly fromEv: number;
  readonly stepEv: number;
  readonly steps: number;
}

/** Most steps: a response's memory and a halo's cost grow with them. */
export const MOST_STEPS = 1000;

/** @throws DomainError for a ladder that begins below 0, has no width, or none or too many steps */
function requireLadder({ fromEv, stepEv, steps }: EnergyLadder): void {
  requireNonNegative('fromEnergy', fromEv);
  requirePositive('energyStep', stepEv);
  if (!(Number.isInteger(steps) && steps >= 1 && steps <= MOST_STEPS))
    throw new DomainError('energySteps', steps, `an integer from 1 to ${MOST_STEPS}`);
}

/**
 * The scenario with the ladder's steps for bins: response() of it gives their rates. The ladder begins at or below the
 * lowest band gap to come.
 *
 * @throws DomainError for a ladder out of its domain
 */
export function ladderScenario(
  scenario: Omit<ResponseScenario, 'ionization' | 'energyPerPairEv' | 'maxElectrons'>,
  ladder: EnergyLadder,
): ResponseScenario {
  requireLadder(ladder);
  const { fromEv, stepEv, steps } = ladder;
  const edge = (step: number): number => stepEdgeEv(fromEv, stepEv, step + 1);
  const ionization: IonizationModel = {
    bandGapEv: fromEv,
    maxSegmentEv: Infinity,
    segmentError: 0,
    breaksEv: (from, to) =>
      Array.from({ length: steps + 1 }, (_, step) => edge(step)).filter((e) => e > from && e < to),
    probabilities(energyEv, out) {
      out.fill(0);
      const step = Math.floor((energyEv - fromEv) / stepEv);
      if (step >= 0 && step < out.length) out[step] = 1;
    },
    reachEv: (bins) => edge(bins),
    lostFraction: () => 0,
  };
  return { ...scenario, ionization, energyPerPairEv: stepEv, maxElectrons: steps };
}

/** Rates per bin, in the steps' unit, for an ionization model: bins 1…maxElectrons. */
export type LadderBinning = (
  stepRates: ArrayLike<number>,
  ionization: IonizationModel,
  maxElectrons: number,
) => Float64Array;

/**
 * The matrix product for a ladder. Steps are divided where a weight jumps and where the model wants it. What lies outside
 * the ladder is not counted.
 *
 * Accuracy: 2e-3 for bins above 1e-3 of the total with steps of 0.1 eV, better with narrower ones
 * (test/physics/rate/energy-ladder.test.ts). Cost: some ten microseconds for the step model, a millisecond for one with
 * Fano fluctuations.
 *
 * @throws DomainError for a ladder out of its domain; the binning, for a band gap below the ladder
 * @example ladderBinning(ladder)(responseRates(kernel, halo), stepIonization(1.12, 3.8), 12)
 */
export function ladderBinning(ladder: EnergyLadder): LadderBinning {
  requireLadder(ladder);
  const { fromEv, stepEv, steps } = ladder;
  const edges = Float64Array.from({ length: steps + 1 }, (_, step) => stepEdgeEv(fromEv, stepEv, step + 1));
  return (stepRates, ionization, maxElectrons) => {
    if (ionization.bandGapEv < fromEv) throw new DomainError('bandGap', ionization.bandGapEv, `at least ${fromEv} eV`);
    const bins = new Float64Array(maxElectrons);
    const weights = new Float64Array(maxElectrons);
    const reach = Math.min(edges[steps], ionization.reachEv(maxElectrons));
    const breaks = [ionization.bandGapEv, ...ionization.breaksEv(fromEv, reach), reach];
    let next = 0;
    for (let step = 0; step < steps; step++) {
      let from = edges[step];
      const end = edges[step + 1];
      while (next < breaks.length && breaks[next] <= from) next++;
      while (stepRates[step] > 0 && from < end) {
        const to = Math.min(end, breaks[next] ?? Infinity, from + ionization.maxSegmentEv);
        ionization.probabilities((from + to) / 2, weights);
        const part = (stepRates[step] * (to - from)) / stepEv;
        for (let n = 0; n < maxElectrons; n++) bins[n] += weights[n] * part;
        from = to;
        while (next < breaks.length && breaks[next] <= from) next++;
      }
    }
    return bins;
  };
}
