/** The answer of POST /v1/modulation but for its provenance: one response, many halos. Runs in a worker thread. */
import { DomainError } from '../../physics/errors.ts';
import { laboratoryVelocity, laboratorySpeedKmPerS as sunSpeedKmPerS } from '../../physics/halo/earth-velocity.ts';
import { annualAmplitude, modulation, modulationExposureKgYr } from '../../physics/modulation/modulation.ts';
import type { CrystalRate } from '../../physics/rate/crystal-rate.ts';
import { responseRates } from '../../physics/rate/response.ts';
import { Problem, pointerOf } from '../problem.ts';
import { DEFAULT_LABORATORY_SPEED_KM_PER_S, isMoving, type MovingHaloIn } from '../schemas/halo.ts';
import type { ModulationAnswer } from '../schemas/modulation.ts';
import { ionizationModelOf, measuredBackgrounds, readoutOf } from './detector-view.ts';
import { windowOf } from './exposure-answer.ts';
import { type NoticeOut, rateNotices } from './notices.ts';
import { type RatesJob, rateOf } from './rates-answer.ts';
import { requireBelowLight, responseOf } from './response-scenario.ts';
import { unrepresentable } from './unrepresentable.ts';
import { atVelocity, distributionOf, largestSpeedKmPerS, shapeOf } from './velocity-distributions.ts';

export interface ModulationJob extends RatesJob {
  readonly instantsMs: readonly number[];
  /** Evenly spaced over a whole year, for the annual amplitude; undefined: the instants are. */
  readonly yearMs: readonly number[] | undefined;
  readonly significance: number;
  /** Where in the body the scenario stands. */
  readonly at: string;
}

type Modulated = ModulationAnswer['total'];
/** Rates per true electron from 1 up, one row a date. */
type RatesByDate = readonly Float64Array[];

export function modulationAnswer(job: ModulationJob): Omit<ModulationAnswer, 'provenance' | 'dates'> {
  const { scenario, instantsMs, yearMs } = job;
  const halo = movingHaloOf(job);
  const { lastElectron } = readoutOf(scenario);
  const dated = datedHalos(halo, [...instantsMs, ...(yearMs ?? [])], job.at);
  const fastest = dated.reduce((a, b) => (b.laboratorySpeedKmPerS > a.laboratorySpeedKmPerS ? b : a));
  const largest = Math.max(...dated.map(largestSpeedKmPerS));
  requireBelowLight(largest, job.at);
  const kernel = responseOf(job, lastElectron, largest, shapeOf(halo));
  const rates = dated.map((onDate) => responseRates(kernel, distributionOf(onDate)));
  if (!rates.every((row) => row.every((rate) => rate >= 0 && rate < Infinity))) throw unrepresentable();

  const direct = rateOf({ ...job, scenario: { ...scenario, halo: fastest, spectrum: false } }, lastElectron);
  const errors = relativeErrors(direct, rates[dated.indexOf(fastest)]);
  const byDate = rates.slice(0, instantsMs.length);
  const { maxElectrons } = scenario.ionization;
  const exposure = exposureOut(job, yearMs ? rates.slice(instantsMs.length) : byDate);
  return {
    laboratorySpeed: {
      unit: 'km/s',
      values: dated.slice(0, instantsMs.length).map(({ laboratorySpeedKmPerS }) => laboratorySpeedKmPerS),
    },
    bins: Array.from({ length: maxElectrons }, (_, bin) => ({
      electrons: bin + 1,
      ...modulatedOut(
        byDate.map((row) => row[bin]),
        errors[bin],
        instantsMs,
      ),
    })),
    total: modulatedOut(
      byDate.map((row) => row.subarray(0, maxElectrons).reduce((a, b) => a + b, 0)),
      Math.max(...errors.slice(0, maxElectrons)),
      instantsMs,
    ),
    exposure,
    notices: noticesOf(halo, rateNotices({ ...scenario, halo: fastest }, direct), exposure),
  };
}

function movingHaloOf({ scenario, at }: ModulationJob): MovingHaloIn {
  if (isMoving(scenario.halo)) return scenario.halo;
  throw refused(`${at}/halo`, 'must stand in the galaxy: a table in the laboratory’s frame has no dates');
}

function refused(pointer: string, detail: string): Problem {
  return new Problem('invalid-input', 'The request has 1 fault.', [{ pointer, detail }]);
}

/** The halo as it is met at each instant. */
function datedHalos(halo: MovingHaloIn, instantsMs: readonly number[], at: string): MovingHaloIn[] {
  try {
    return instantsMs.map((ms) => {
      const onDate = atVelocity(halo, laboratoryVelocity(halo.circularSpeedKmPerS, halo.peculiarVelocityKmPerS, ms));
      largestSpeedKmPerS(onDate); // refuses what the model refuses on this date
      return onDate;
    });
  } catch (error) {
    if (!(error instanceof DomainError)) throw error;
    const path = error.parameter[0] === 'laboratorySpeed' ? ['circularSpeed'] : error.parameter;
    throw refused(`${at}/halo${pointerOf(path)}`, `must be ${error.allowed} on every date`);
  }
}

/** What the response is off by, measured against the direct integral on the date with the fastest laboratory, per bin. */
function relativeErrors(direct: CrystalRate, fromResponse: Float64Array): number[] {
  return direct.bins.map(({ rate }, bin) =>
    rate.value > 0 ? Math.min(1, Math.abs(fromResponse[bin] / rate.value - 1) + rate.relativeError) : 0,
  );
}

function modulatedOut(rates: readonly number[], relativeError: number, instantsMs: readonly number[]): Modulated {
  const { mean, amplitude, fractionalAmplitude, maximumAt } = modulation(rates);
  return {
    rates: { unit: '1/(kg yr)', values: [...rates] },
    mean: { value: mean, unit: '1/(kg yr)', relativeError: mean > 0 ? relativeError : 0 },
    amplitude: {
      value: amplitude,
      unit: '1/(kg yr)',
      relativeError: amplitude > 0 ? Math.min(1, relativeError / fractionalAmplitude) : 0,
    },
    fractionalAmplitude,
    maximum: mean > 0 ? new Date(instantsMs[maximumAt]).toISOString().slice(0, 10) : null,
  };
}

/** Measured bins of the goal's window; `year`: rates evenly spaced over it. */
function exposureOut({ scenario, significance }: ModulationJob, year: RatesByDate): ModulationAnswer['exposure'] {
  const { goal, ionization } = scenario;
  const readout = readoutOf(scenario);
  const { from, to } = goal ? windowOf(goal, ionization.maxElectrons) : { from: 1, to: ionization.maxElectrons };
  const backgrounds = measuredBackgrounds(scenario, ionizationModelOf(ionization), readout);
  const measured = year.map((row) => readout.apply([0, ...row]).bins);
  const bins = Array.from({ length: to - from + 1 }, (_, i) => {
    const electrons = from + i;
    const rates = measured.map((row) => row[electrons]);
    return {
      electrons,
      annualAmplitude: annualAmplitude(rates),
      meanSignal: rates.reduce((sum, rate) => sum + rate, 0) / rates.length,
      background: backgrounds.reduce((sum, { ratesPerKgYr }) => sum + ratesPerKgYr[electrons], 0),
    };
  });
  const needed = modulationExposureKgYr(bins, significance);
  const rate = (value: number) => ({ value, unit: '1/(kg yr)' as const });
  return {
    needed: needed === undefined ? null : { value: needed, unit: 'kg yr' },
    significance,
    bins: bins.map(({ electrons, annualAmplitude: amplitude, meanSignal, background }) => ({
      electrons,
      annualAmplitude: rate(amplitude),
      signal: rate(meanSignal),
      background: rate(background),
    })),
  };
}

function noticesOf(halo: MovingHaloIn, notices: NoticeOut[], { needed }: ModulationAnswer['exposure']): NoticeOut[] {
  if (givesLaboratorySpeed(halo)) {
    notices.push({
      code: 'laboratory-speed-not-used',
      detail: 'The laboratory’s speed is that of the dates; the one that the scenario’s halo gives is not used.',
    });
  }
  if (needed === null) {
    notices.push({
      code: 'goal-unreachable',
      detail:
        'No exposure shows the modulation: nothing in the window changes over the year, or too little for any exposure.',
    });
  }
  return notices;
}

/** Whether the scenario says how fast its laboratory moves, by a speed or a date. */
function givesLaboratorySpeed(halo: MovingHaloIn): boolean {
  const { laboratorySpeedKmPerS, circularSpeedKmPerS, peculiarVelocityKmPerS } = halo;
  const implied = peculiarVelocityKmPerS
    ? sunSpeedKmPerS(circularSpeedKmPerS, peculiarVelocityKmPerS)
    : DEFAULT_LABORATORY_SPEED_KM_PER_S;
  return laboratorySpeedKmPerS !== implied;
}
