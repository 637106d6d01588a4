/** POST /v1/modulation: a scenario's rates by date, and the exposure at which their modulation is seen. */
import { z } from 'zod';
import { FIRST_YEAR, LAST_YEAR } from '../../physics/halo/earth-velocity.ts';
import { instant } from './detector.ts';
import { type HaloIn, isMoving } from './halo.ts';
import { estimateOut, quantitiesOut, quantityOut } from './quantity.ts';
import { Notice, Provenance } from './rates.ts';
import { Scenario, type ScenarioIn } from './scenario.ts';

const MOST_DATES = 1000;

export interface ModulationIn {
  readonly scenario: ScenarioIn;
  readonly year: number | undefined;
  readonly dates: readonly string[] | undefined;
  readonly significance: number;
}

function checkModulation(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const { year, dates, scenario } = input as { year?: unknown; dates?: unknown; scenario?: Partial<ScenarioIn> };
  const issue = (path: (string | number)[], message: string): void =>
    context.addIssue({ code: 'custom', path, message });
  if ((year === undefined) === (dates === undefined)) issue([], 'takes "year" or "dates", one of them');
  if (Array.isArray(dates)) {
    dates.forEach((date, i) => {
      const ms = Date.parse(String(date));
      if (ms < Date.UTC(FIRST_YEAR, 0, 1) || ms >= Date.UTC(LAST_YEAR + 1, 0, 1))
        issue(['dates', i], `must be an instant in the years ${FIRST_YEAR} to ${LAST_YEAR}`);
    });
  }
  if (typeof scenario !== 'object' || scenario === null) return;
  const { halo } = scenario;
  if (isRead(halo) && !isMoving(halo))
    issue(
      ['scenario', 'halo', 'tabulated', 'kind'],
      'must be "galactic": a table in the laboratory’s frame has no dates',
    );
  if (scenario.spectrum === true) issue(['scenario', 'spectrum'], 'belongs to POST /v1/rates');
  if (scenario.payload !== undefined) issue(['scenario', 'payload'], 'belongs to POST /v1/rates');
}

/** A faulty halo is still what came in; its own faults are enough. */
function isRead(halo: HaloIn | undefined): halo is HaloIn {
  return typeof halo === 'object' && halo !== null && 'localDensityGevPerCm3' in halo;
}

export const ModulationRequest = z
  .strictObject({
    scenario: Scenario.meta({
      description: 'Its laboratory speed or date is not used: the dates set it. Of a goal only the window is.',
    }),
    year: z.int().min(FIRST_YEAR).max(LAST_YEAR).optional().meta({ description: 'Every day of it, 00:00 UTC.' }),
    dates: z
      .array(instant)
      .min(1)
      .max(MOST_DATES)
      .optional()
      .meta({ description: `At most ${MOST_DATES}.` }),
    significance: z.number().positive().max(100).default(3).meta({
      description: 'σ at which the modulation itself is to be seen.',
    }),
  })
  .superRefine(checkModulation, { when: () => true })
  .meta({ id: 'ModulationRequest', description: 'A scenario and a year, or a list of dates.' })
  .transform(({ scenario, year, dates, significance }): ModulationIn => ({ scenario, year, dates, significance }));

const modulated = {
  rates: quantitiesOut('1/(kg yr)').meta({ description: 'At each date, in their order.' }),
  mean: estimateOut('1/(kg yr)').meta({ description: 'Over the days of the year, or over the dates.' }),
  amplitude: estimateOut('1/(kg yr)').meta({ description: '(max − min)/2.' }),
  fractionalAmplitude: z.number().meta({ description: 'amplitude/mean; 0 where there is no rate.' }),
  maximum: z.string().nullable().meta({ description: 'UTC day of the largest rate; null where there is none.' }),
};

export const ModulationAnswer = z
  .strictObject({
    dates: z.array(z.string()).meta({ description: 'As given, or the days of the year.' }),
    laboratorySpeed: quantitiesOut('km/s').meta({ description: 'v_E at each date.' }),
    bins: z.array(z.strictObject({ electrons: z.int(), ...modulated }).meta({ id: 'ModulatedBin' })),
    total: z.strictObject(modulated).meta({ description: 'Sum of the bins.' }),
    exposure: z
      .strictObject({
        needed: quantityOut('kg yr').nullable().meta({
          description: 'X = Z²/Σ A²/[2 (S̄ + B)], live mass × time over whole years; null where nothing modulates.',
        }),
        significance: z.number(),
        bins: z.array(
          z.strictObject({
            electrons: z.int(),
            annualAmplitude: quantityOut('1/(kg yr)').meta({ description: 'A, the annual Fourier amplitude.' }),
            signal: quantityOut('1/(kg yr)').meta({ description: 'S̄, the year’s mean.' }),
            background: quantityOut('1/(kg yr)').meta({ description: 'B, constant.' }),
          }),
        ),
      })
      .meta({
        id: 'ModulationExposure',
        description:
          'What it takes to see the modulation, in the measured bins of the goal’s window, over the year (with dates: that of the first).',
      }),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({ id: 'ModulationAnswer', description: 'Planning estimates.' });
export type ModulationAnswer = z.output<typeof ModulationAnswer>;
