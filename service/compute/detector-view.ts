/**
 * What the detector measures: signal and backgrounds per measured electron bin, after ionization, noise and efficiency.
 */
import { darkCurrentBackground, flatBackground, perBinBackground } from '../../physics/detector/backgrounds.ts';
import { type ReadoutResponse, readoutResponse } from '../../physics/detector/readout.ts';
import type { Background } from '../../physics/exposure/needed-exposure.ts';
import { fanoIonization } from '../../physics/ionization/fano.ts';
import type { IonizationModel } from '../../physics/ionization/ionization-model.ts';
import { stepIonization } from '../../physics/ionization/step.ts';
import { tableIonization } from '../../physics/ionization/table.ts';
import type { CrystalRate, Estimate } from '../../physics/rate/crystal-rate.ts';
import { type BackgroundIn, NO_READOUT } from '../schemas/detector.ts';
import type { ResolvedIonization, ResolvedScenario } from './resolved-scenario.ts';

export function ionizationModelOf(ionization: ResolvedIonization): IonizationModel {
  const { bandGapEv, energyPerPairEv, fanoFactor, table } = ionization;
  switch (ionization.model) {
    case 'step':
      return stepIonization(bandGapEv, energyPerPairEv);
    case 'fano':
      return fanoIonization(bandGapEv, energyPerPairEv, fanoFactor ?? 0);
    case 'table':
      return tableIonization({
        energiesEv: table?.energiesEv ?? [],
        probabilities: table?.probabilities ?? [],
        bandGapEv,
      });
  }
}

export function readoutOf(scenario: ResolvedScenario): ReadoutResponse {
  const { noiseElectrons, efficiency } = scenario.readout ?? NO_READOUT;
  return readoutResponse({ noiseElectrons, efficiency, maxElectrons: scenario.ionization.maxElectrons });
}

/** Signal per measured bin 0…maxElectrons, from a rate computed up to the last true electron that the readout follows. */
export function measuredSignal(rate: CrystalRate, response: ReadoutResponse): Estimate[] {
  const signal = response.apply([0, ...rate.bins.map((bin) => bin.rate.value)]).bins;
  const errors = response.apply([0, ...rate.bins.map((bin) => bin.rate.value * bin.rate.relativeError)]).bins;
  return Array.from(signal, (value, n) => ({ value, relativeError: value > 0 ? errors[n] / value : 0 }));
}

/** Every background, 1/(kg yr), per measured bin 0…maxElectrons. */
export function measuredBackgrounds(
  scenario: ResolvedScenario,
  model: IonizationModel,
  response: ReadoutResponse,
): Background[] {
  // flat spectra differ by a factor only, and their path through the ionization model is the expensive part
  let flat: Float64Array | undefined;
  const ratesOf = (background: BackgroundIn): Float64Array => {
    switch (background.kind) {
      case 'perBin':
        return perBinBackground(background.rates, response.maxElectrons);
      case 'flat':
        flat ??= flatBackground(1, model, response);
        return flat.map((rate) => rate * background.ratePerKgYearKev);
      case 'darkCurrent':
        return darkCurrentBackground(background, response);
    }
  };
  return scenario.backgrounds.map((background) => ({
    name: background.name,
    relativeUncertainty: background.relativeUncertainty,
    ratesPerKgYr: [...ratesOf(background)],
  }));
}
