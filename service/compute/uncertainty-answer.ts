/** What uncertain parameters do to rates and exposure: quantiles over seeded draws. Runs in a worker thread. */
import { DomainError } from '../../physics/errors.ts';
import { neededExposuresKgYr } from '../../physics/exposure/many-exposures.ts';
import { parameterDraws } from '../../physics/uncertainty/draws.ts';
import { quantiles, REPORTED_QUANTILES } from '../../physics/uncertainty/quantiles.ts';
import { varianceShares } from '../../physics/uncertainty/variance-shares.ts';
import { invalidInput } from '../problem.ts';
import type { UncertaintyIn, UncertaintyOut } from '../schemas/uncertainty.ts';
import { ionizationModelOf, measuredBackgrounds, readoutOf } from './detector-view.ts';
import { drawnRates } from './drawn-rates.ts';
import { drawnScenario, isPhysical, parameterValue } from './drawn-scenario.ts';
import { windowOf, windowRates } from './exposure-answer.ts';
import type { RatesJob } from './rates-answer.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';
import { unrepresentable } from './unrepresentable.ts';

type Shares = UncertaintyOut['total']['varianceShares'];

export function uncertaintyOut(job: RatesJob, uncertainty: UncertaintyIn): UncertaintyOut {
  const { scenario } = job;
  const { draws, seed, parameters: names } = uncertainty;
  const { values, redrawn } = drawnValues(scenario, uncertainty);
  const drawn = values.map((row) => drawnScenario(scenario, names, row));
  const rates = drawnRates(job, drawn, names, readoutOf(scenario).lastElectron);
  if (!rates.every((row) => row.every((rate) => rate >= 0 && rate < Infinity))) throw unrepresentable();

  const sharesOf = (results: readonly number[]): Shares => {
    const found = varianceShares(values, results);
    if (!found) return null;
    return {
      ...Object.fromEntries(names.map((name, i) => [name, found.shares[i]])),
      unexplained: found.unexplained,
    };
  };
  const rateOut = (results: readonly number[]) => ({
    rate: { unit: '1/(kg yr)' as const, values: quantiles(results) },
    varianceShares: sharesOf(results),
  });
  const { maxElectrons } = scenario.ionization;
  return {
    draws,
    seed,
    redrawn,
    quantiles: [...REPORTED_QUANTILES],
    bins: Array.from({ length: maxElectrons }, (_, bin) => ({
      electrons: bin + 1,
      ...rateOut(rates.map((row) => row[bin])),
    })),
    total: rateOut(rates.map((row) => row.subarray(0, maxElectrons).reduce((a, b) => a + b, 0))),
    ...exposureOut(scenario, drawn, rates, sharesOf),
  };
}

function drawnValues(scenario: ResolvedScenario, { draws, seed, parameters, spread }: UncertaintyIn) {
  try {
    return parameterDraws(
      { means: parameters.map((name) => parameterValue(name, scenario)), spread },
      { draws, seed, isPhysical: (row) => isPhysical(scenario, parameters, row) },
    );
  } catch (error) {
    if (!(error instanceof DomainError)) throw error;
    throw invalidInput([{ pointer: '/uncertainty', detail: `must have ${error.allowed}` }]);
  }
}

/** The needed exposure of every draw, from what is measured in the goal's window. */
function exposureOut(
  scenario: ResolvedScenario,
  drawn: readonly ResolvedScenario[],
  rates: readonly Float64Array[],
  sharesOf: (results: readonly number[]) => Shares,
): Pick<UncertaintyOut, 'exposure'> {
  const { goal } = scenario;
  if (!goal) return {};
  const readout = readoutOf(scenario);
  const backgroundsOf = (one: ResolvedScenario) => measuredBackgrounds(one, ionizationModelOf(one.ionization), readout);
  const fixed = backgroundsOf(scenario);
  // only a flat spectrum goes through the ionization model
  const isFixed = !scenario.backgrounds.some(({ kind }) => kind === 'flat');
  const counted = windowOf(goal, scenario.ionization.maxElectrons);
  const windows = rates.map((row, i) => {
    const signal = Array.from(readout.apply([0, ...row]).bins, (value) => ({ value, relativeError: 0 }));
    return windowRates(signal, isFixed ? fixed : backgroundsOf(drawn[i]), counted);
  });
  const needed = Array.from(neededExposuresKgYr(windows, goal));
  return {
    exposure: {
      needed: {
        unit: 'kg yr',
        values: quantiles(needed).map((value) => (value < Infinity ? value : null)),
      },
      unreached: needed.filter((value) => value === Infinity).length,
      varianceShares: sharesOf(needed),
    },
  };
}
