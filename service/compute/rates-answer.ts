/** The answer of POST /v1/rates but for its provenance: runs in a worker thread. */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import type { IonizationModel } from '../../physics/ionization/ionization-model.ts';
import { stepEdgeEv, stepIonization } from '../../physics/ionization/step.ts';
import { type CrystalRate, crystalRate, type Estimate } from '../../physics/rate/crystal-rate.ts';
import { Problem } from '../problem.ts';
import type { HaloIn } from '../schemas/halo.ts';
import type { RatesAnswer } from '../schemas/rates.ts';
import type { DarkMatterIn, GoalIn } from '../schemas/scenario.ts';
import { exposureAnswer } from './exposure-answer.ts';
import { haloOf } from './halos.ts';
import { keptTable } from './kept-tables.ts';
import { rateNotices } from './notices.ts';

/** A scenario with everything looked up: the table by its id, gap and pair energy from here or from the table. */
export interface ResolvedScenario {
  readonly darkMatter: DarkMatterIn;
  readonly halo: HaloIn;
  readonly crystal: { readonly id: string; readonly screened: boolean };
  readonly ionization: { readonly bandGapEv: number; readonly energyPerPairEv: number; readonly maxElectrons: number };
  readonly goal: GoalIn | undefined;
  readonly spectrum: boolean;
}

export interface RatesJob {
  readonly scenario: ResolvedScenario;
  readonly table: CrystalTable;
}

export function ratesAnswer({ scenario, table }: RatesJob): Omit<RatesAnswer, 'provenance'> {
  const { darkMatter, halo, ionization } = scenario;
  const rate = crystalRate(
    {
      massEv: darkMatter.massMev * 1e6,
      crossSectionCm2: darkMatter.referenceCrossSectionCm2,
      mediator: darkMatter.mediator,
      splittingEv: darkMatter.massSplittingEv,
      localDensityGevPerCm3: halo.localDensityGevPerCm3,
      halo: haloOf(halo),
      table: keptTable(scenario.crystal.id, table),
      ionization: ionizationOf(ionization),
      energyPerPairEv: ionization.energyPerPairEv,
      maxElectrons: ionization.maxElectrons,
    },
    scenario.spectrum,
  );
  refuseUnrepresentable(rate);
  const notices = rateNotices(scenario, rate);
  const exposure = scenario.goal && exposureAnswer(scenario.goal, rate, notices);
  return {
    bins: rate.bins.map((bin) => ({
      electrons: bin.electrons,
      energy: { unit: 'eV', from: bin.fromEv, to: bin.toEv },
      rate: rateOut(bin.rate),
    })),
    total: rateOut(rate.total),
    overflow: rateOut(rate.overflow),
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

/** The step model up to the last bin returned: above it, a tiny energy per pair makes more steps than memory holds. */
function ionizationOf({ bandGapEv, energyPerPairEv, maxElectrons }: ResolvedScenario['ionization']): IonizationModel {
  const model = stepIonization(bandGapEv, energyPerPairEv);
  const lastEv = stepEdgeEv(bandGapEv, energyPerPairEv, maxElectrons + 1);
  return { ...model, breaksEv: (fromEv, toEv) => model.breaksEv(fromEv, Math.min(toEv, lastEv)) };
}

export function rateOut(rate: Estimate): { value: number; unit: '1/(kg yr)'; relativeError: number } {
  return { value: rate.value, unit: '1/(kg yr)', relativeError: rate.relativeError };
}

/** Inputs may each be sensible and their product beyond what a number holds; that is said, not answered with null. */
function refuseUnrepresentable(rate: CrystalRate): void {
  const numbers = [rate.total, rate.overflow, ...rate.bins.map((bin) => bin.rate)].flatMap((r) => [
    r.value,
    r.relativeError,
  ]);
  const spectrum = rate.spectrum ? [...rate.spectrum.values] : [];
  if ([...numbers, ...spectrum, rate.largestEnergyEv, rate.smallestMassEv].every(Number.isFinite)) return;
  throw new Problem('invalid-input', 'The request has 1 fault.', [
    { pointer: '', detail: 'the numbers are so large or so small that the rate cannot be represented' },
  ]);
}
