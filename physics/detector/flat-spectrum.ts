/**
 * A spectrum flat in deposited energy, as a rate of true electrons: r ∫ P(n|E) dE from the gap upwards. The spectrum has no upper
 * end, so the integral ends where the model no longer feeds the last electron asked for.
 */
import { requireNonNegative } from '../errors.ts';
import type { IonizationModel } from '../ionization/ionization-model.ts';

const EV_PER_KEV = 1000;

/**
 * Rates, 1/(kg yr), of k = 0…lastElectron true electrons (k = 0: none, energy below the gap frees no charge). The rule is that of
 * the rate core, the model's weight at the middle of each of its segments: exact for the step model (every bin gets the rate in
 * one energy per pair) and for a table, within 3e-6 for the Fano model (test/physics/detector/flat-spectrum.test.ts).
 *
 * @param ratePerKgYearKev r, 1/(kg yr keV), ≥ 0. @throws DomainError otherwise.
 */
export function flatSpectrumRates(
  ratePerKgYearKev: number,
  ionization: IonizationModel,
  lastElectron: number,
): Float64Array {
  requireNonNegative('rate', ratePerKgYearKev);
  const rates = new Float64Array(lastElectron + 1);
  const weights = new Float64Array(lastElectron);
  const cuts = segmentCutsEv(ionization, lastElectron);
  for (let s = 1; s < cuts.length; s++) {
    ionization.probabilities((cuts[s - 1] + cuts[s]) / 2, weights);
    const rate = (ratePerKgYearKev / EV_PER_KEV) * (cuts[s] - cuts[s - 1]);
    for (let n = 1; n <= lastElectron; n++) rates[n] += weights[n - 1] * rate;
  }
  return rates;
}

/** Ends of the segments, eV, from the gap to the model's reach; just the gap where it reaches nothing. */
function segmentCutsEv(ionization: IonizationModel, lastElectron: number): number[] {
  const from = ionization.bandGapEv;
  const to = ionization.reachEv(lastElectron);
  if (!(to > from)) return [from];
  const cuts = [from];
  for (const end of [...ionization.breaksEv(from, to), to]) {
    const start = cuts[cuts.length - 1];
    const pieces = Math.max(1, Math.ceil((end - start) / ionization.maxSegmentEv));
    for (let p = 1; p < pieces; p++) cuts.push(start + ((end - start) * p) / pieces);
    cuts.push(end);
  }
  return cuts;
}
