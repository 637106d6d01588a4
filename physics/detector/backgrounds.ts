/**
 * The three kinds of background, each brought to the same form: a rate, 1/(kg yr), in every measured bin 0…maxElectrons.
 *
 * A flat spectrum and the dark current pass through noise and efficiency; what is given per bin was measured that way and is left
 * as it is. Empty pixels, and those among them that the noise makes look charged, come from the dark current alone, also at
 * zero current.
 */
import { DomainError } from '../errors.ts';
import type { IonizationModel } from '../ionization/ionization-model.ts';
import { type DarkCurrent, darkCurrentRates } from './dark-current.ts';
import { flatSpectrumRates } from './flat-spectrum.ts';
import type { ReadoutResponse } from './readout.ts';

export interface MeasuredBinRate {
  /** Measured electrons, an integer from 0 to maxElectrons, named once. */
  readonly electrons: number;
  /** ≥ 0. */
  readonly ratePerKgYear: number;
}

/** Rates as measured; bins not named are 0. @throws DomainError for a bin outside 0…maxElectrons or named twice, or a rate < 0. */
export function perBinBackground(rates: readonly MeasuredBinRate[], maxElectrons: number): Float64Array {
  const bins = new Float64Array(maxElectrons + 1);
  const named = new Set<number>();
  rates.forEach(({ electrons, ratePerKgYear }, i) => {
    if (!(Number.isInteger(electrons) && electrons >= 0 && electrons <= maxElectrons)) {
      throw new DomainError(['rates', i, 'electrons'], electrons, `an integer from 0 to ${maxElectrons}`);
    }
    if (named.has(electrons)) throw new DomainError(['rates', i, 'electrons'], electrons, 'a bin not named before');
    if (!(ratePerKgYear >= 0 && ratePerKgYear < Infinity)) {
      throw new DomainError(['rates', i, 'rate'], ratePerKgYear, 'a finite number of at least 0');
    }
    named.add(electrons);
    bins[electrons] = ratePerKgYear;
  });
  return bins;
}

/** A spectrum flat in deposited energy, 1/(kg yr keV), from the gap up: ionization, noise, efficiency. Errors: flatSpectrumRates. */
export function flatBackground(
  ratePerKgYearKev: number,
  ionization: IonizationModel,
  response: ReadoutResponse,
): Float64Array {
  return response.apply(flatSpectrumRates(ratePerKgYearKev, ionization, response.lastElectron)).bins;
}

/** Dark current, with its empty pixels: pile-up, noise, efficiency. Errors: darkCurrentRates. */
export function darkCurrentBackground(darkCurrent: DarkCurrent, response: ReadoutResponse): Float64Array {
  return response.apply(darkCurrentRates(darkCurrent, response.lastElectron)).bins;
}
