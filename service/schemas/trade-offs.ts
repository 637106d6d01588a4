/** POST /v1/trade-offs: the exposure against the window's start and the readout interval. */
import { z } from 'zod';
import { QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';
import { KINDS, quantityOut } from './quantity.ts';
import { Exposure, Notice, Provenance } from './rates.ts';
import { Scenario, type ScenarioIn } from './scenario.ts';

const MOST_CHOICES = 100;

export interface TradeOffsIn {
  readonly scenario: ScenarioIn;
  readonly windowFrom: readonly number[] | undefined;
  readonly readoutIntervalsDays: readonly number[] | undefined;
}

const Intervals = z
  .strictObject({
    unit: z.string().meta({ examples: ['day'], maxLength: 64 }),
    values: z.array(z.number().positive()).min(1).max(MOST_CHOICES),
  })
  .transform(({ unit, values }, context): number[] => {
    try {
      return values.map((value) => quantityOf(value, unit, KINDS.duration));
    } catch (error) {
      if (!(error instanceof QuantityError)) throw error;
      context.addIssue({ code: 'custom', path: ['unit'], message: error.message });
      return z.NEVER;
    }
  });

function checkTradeOffs(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const { scenario, windowFrom, readoutInterval } = input as {
    scenario?: Partial<ScenarioIn>;
    windowFrom?: number[];
    readoutInterval?: unknown;
  };
  const issue = (path: (string | number)[], message: string): void =>
    context.addIssue({ code: 'custom', path, message });
  if (windowFrom === undefined && readoutInterval === undefined)
    issue([], 'needs "windowFrom", "readoutInterval" or both');
  if (typeof scenario !== 'object' || scenario === null) return;
  if (!('goal' in scenario) || scenario.goal === undefined)
    issue(['scenario', 'goal'], 'is needed: it is what the exposures are for');
  const to = scenario.goal?.window?.to ?? scenario.ionization?.maxElectrons;
  if (Array.isArray(windowFrom) && typeof to === 'number') {
    windowFrom.forEach((from, i) => {
      if (from > to) issue(['windowFrom', i], `is beyond the window's end, ${to}`);
    });
  }
  const dark =
    Array.isArray(scenario.backgrounds) &&
    scenario.backgrounds.some((background) => background?.kind === 'darkCurrent');
  if (readoutInterval !== undefined && !dark)
    issue(['readoutInterval'], 'needs a background of kind "darkCurrent" in the scenario');
}

export const TradeOffs = z
  .strictObject({
    scenario: Scenario,
    windowFrom: z
      .array(z.int().min(1).max(100))
      .min(1)
      .max(MOST_CHOICES)
      .optional()
      .meta({ description: 'Starts of the window, measured electrons.' }),
    readoutInterval: Intervals.optional().meta({
      description: 'Times between two readings, for every dark current of the scenario.',
    }),
  })
  .superRefine(checkTradeOffs, { when: () => true })
  .meta({ id: 'TradeOffsRequest' })
  .transform(
    ({ scenario, windowFrom, readoutInterval }): TradeOffsIn => ({
      scenario,
      windowFrom,
      readoutIntervalsDays: readoutInterval,
    }),
  );

const Choice = z.strictObject({
  windowFrom: z.int(),
  readoutInterval: quantityOut('day').optional(),
  exposure: Exposure,
});

export const TradeOffsAnswer = z
  .strictObject({
    choices: z
      .array(Choice.meta({ id: 'TradeOff' }))
      .meta({ description: 'Every combination, intervals within starts.' }),
    cheapest: Choice.nullable().meta({
      description: 'The choice that needs the least exposure; null where none reaches the goal.',
    }),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({ id: 'TradeOffsAnswer', description: 'Planning estimates.' });
export type TradeOffsAnswer = z.output<typeof TradeOffsAnswer>;
