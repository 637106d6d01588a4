/** The answer of POST /v1/rates but for its provenance: runs in a worker thread. */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import type { ReadoutResponse } from '../../physics/detector/readout.ts';
import type { Background } from '../../physics/exposure/needed-exposure.ts';
import { type CrystalRate, crystalRate, type Estimate } from '../../physics/rate/crystal-rate.ts';
import type { RatesAnswer } from '../schemas/rates.ts';
import type { UncertaintyIn } from '../schemas/uncertainty.ts';
import { ionizationModelOf, measuredBackgrounds, measuredSignal, readoutOf } from './detector-view.ts';
import { rateOut, sumOf } from './estimates.ts';
import { exposureAnswer } from './exposure-answer.ts';
import { haloFacts } from './halo-facts.ts';
import { haloOf } from './halos.ts';
import { rateNotices } from './notices.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';
import { responseOut } from './response-answer.ts';
import { responseScenarioOf } from './response-scenario.ts';
import { uncertaintyOut } from './uncertainty-answer.ts';
import { unrepresentable } from './unrepresentable.ts';
import { isBeyondDefault } from './velocity-distributions.ts';

export interface RatesJob {
  readonly scenario: ResolvedScenario;
  readonly table: CrystalTable;
}

/** Rates per true electron up to `lastElectron`, which noise may need beyond those that are shown. */
export function rateOf(job: RatesJob, lastElectron: number): CrystalRate {
  const { halo, spectrum } = job.scenario;
  const rate = crystalRate({ ...responseScenarioOf(job, lastElectron), halo: haloOf(halo) }, spectrum);
  refuseUnrepresentable(rate);
  return rate;
}

/** What else is asked of the scenario; absent where it is not. */
export interface RatesExtras {
  readonly response?: true;
  readonly uncertainty?: UncertaintyIn;
}

export function ratesAnswer(job: RatesJob & RatesExtras): Omit<RatesAnswer, 'provenance'> {
  const { scenario } = job;
  const response = readoutOf(scenario);
  const rate = rateOf(job, response.lastElectron);
  const signal = measuredSignal(rate, response);
  const backgrounds = measuredBackgrounds(scenario, ionizationModelOf(scenario.ionization), response);
  const shown = rate.bins.slice(0, scenario.ionization.maxElectrons);
  const beyond = rate.bins.slice(scenario.ionization.maxElectrons).map((bin) => bin.rate);
  const notices = rateNotices(scenario, rate);
  const exposure = scenario.goal && exposureAnswer(scenario, scenario.goal, signal, backgrounds, notices);
  return {
    bins: shown.map((bin) => ({
      electrons: bin.electrons,
      energy: { unit: 'eV', from: bin.fromEv, to: bin.toEv },
      rate: rateOut(bin.rate),
    })),
    total: rateOut(sumOf(shown.map((bin) => bin.rate))),
    overflow: rateOut(sumOf([...beyond, rate.overflow])),
    ...(scenario.ionization.model === 'table' ? { lostCharge: rateOut(rate.lost) } : {}),
    ...(scenario.readout || backgrounds.length > 0
      ? { measured: measuredOut(scenario, signal, backgrounds, response) }
      : {}),
    ...(exposure ? { exposure } : {}),
    ...(isBeyondDefault(scenario.halo) ? { halo: haloFacts(scenario.halo) } : {}),
    ...(rate.spectrum
      ? {
          spectrum: {
            energy: { unit: 'eV', edges: [...rate.spectrum.energyEv] },
            rate: {
              unit: '1/(kg yr eV)',
              values: [...rate.spectrum.values],
              relativeErrors: [...rate.spectrum.relativeErrors],
            },
          },
        }
      : {}),
    ...(job.response ? { response: responseOut(job) } : {}),
    ...(job.uncertainty ? { uncertainty: uncertaintyOut(job, job.uncertainty) } : {}),
    notices,
  };
}

function measuredOut(
  scenario: ResolvedScenario,
  signal: readonly Estimate[],
  backgrounds: readonly Background[],
  response: ReadoutResponse,
): NonNullable<RatesAnswer['measured']> {
  return {
    bins: signal.map((rate, electrons) => ({
      electrons,
      signal: rateOut(rate),
      background: {
        value: backgrounds.reduce((sum, { ratesPerKgYr }) => sum + ratesPerKgYr[electrons], 0),
        unit: '1/(kg yr)',
      },
    })),
    backgrounds: backgrounds.map(({ name, ratesPerKgYr }) => ({
      name,
      rates: { unit: '1/(kg yr)', values: [...ratesPerKgYr] },
    })),
    ...(scenario.readout?.responseMatrix ? { responseMatrix: response.matrix.map((row) => [...row]) } : {}),
  };
}

function refuseUnrepresentable(rate: CrystalRate): void {
  const numbers = [rate.total, rate.overflow, rate.lost, ...rate.bins.map((bin) => bin.rate)].flatMap((r) => [
    r.value,
    r.relativeError,
  ]);
  const spectrum = rate.spectrum ? [...rate.spectrum.values, ...rate.spectrum.relativeErrors] : [];
  const rates = [...numbers, ...spectrum].every((value) => value >= 0 && value < Infinity);
  const ends = [rate.largestEnergyEv, rate.smallestMassEv, ...rate.bins.map((bin) => bin.toEv)];
  if (rates && ends.every(Number.isFinite)) return;
  throw unrepresentable();
}
