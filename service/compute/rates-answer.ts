/** The answer of POST /v1/rates but for its provenance: runs in a worker thread. */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import type { ReadoutResponse } from '../../physics/detector/readout.ts';
import type { Background } from '../../physics/exposure/needed-exposure.ts';
import { type CrystalRate, crystalRate, type Estimate } from '../../physics/rate/crystal-rate.ts';
import { invalidInput, type Problem } from '../problem.ts';
import type { RatesAnswer } from '../schemas/rates.ts';
import { ionizationModelOf, measuredBackgrounds, measuredSignal, readoutOf } from './detector-view.ts';
import { rateOut, sumOf } from './estimates.ts';
import { exposureAnswer } from './exposure-answer.ts';
import { haloOf } from './halos.ts';
import { keptTable } from './kept-tables.ts';
import { rateNotices } from './notices.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';

export interface RatesJob {
  readonly scenario: ResolvedScenario;
  readonly table: CrystalTable;
}

/** Rates per true electron up to `lastElectron`, which noise may need beyond those that are shown. */
export function rateOf({ scenario, table }: RatesJob, lastElectron: number): CrystalRate {
  const { darkMatter, halo, ionization } = scenario;
  const rate = crystalRate(
    {
      massEv: darkMatter.massMev * 1e6,
      crossSectionCm2: darkMatter.referenceCrossSectionCm2,
      mediator: darkMatter.mediator,
      splittingEv: darkMatter.massSplittingEv,
      localDensityGevPerCm3: halo.localDensityGevPerCm3,
      halo: haloOf(halo),
      table: keptTable(scenario.crystal, table),
      ionization: ionizationModelOf(ionization),
      energyPerPairEv: ionization.energyPerPairEv,
      maxElectrons: lastElectron,
    },
    scenario.spectrum,
  );
  refuseUnrepresentable(rate);
  return rate;
}

export function ratesAnswer(job: RatesJob): Omit<RatesAnswer, 'provenance'> {
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

/** Inputs may each be sensible and their product beyond what a number holds; that is said, not answered with null. */
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

export function unrepresentable(): Problem {
  return invalidInput([
    { pointer: '', detail: 'the numbers are so large or so small that the rate cannot be represented' },
  ]);
}
