/** POST /v1/reach: the smallest cross section an exposure tests, mass by mass. */
import { z } from 'zod';
import { DomainError } from '../../physics/errors.ts';
import { QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';
import { logSpacedMasses } from '../../physics/reach/mass-grid.ts';
import { ABOVE_ZERO, estimateOut, KINDS, quantity, quantityOut } from './quantity.ts';
import { Notice, Provenance } from './rates.ts';
import { ReachScenario, type ReachScenarioIn } from './scenario.ts';

const MOST_MASSES = 1000;

export interface ReachIn {
  readonly scenario: ReachScenarioIn;
  readonly exposureKgYr: number;
  readonly massesMev: readonly number[];
}

const mass = (id: string, description: string) => quantity(id, KINDS.mass, ABOVE_ZERO, description);

const MassRange = z
  .strictObject({
    from: mass('FirstMass', 'First mass.'),
    to: mass('LastMass', 'Last mass.'),
    count: z.int().min(2).max(MOST_MASSES),
  })
  .meta({ id: 'MassRange', description: 'Evenly spaced in the logarithm, both ends included.' })
  .transform(({ from, to, count }, context): number[] => {
    try {
      return logSpacedMasses({ fromMev: from, toMev: to, count });
    } catch (error) {
      if (!(error instanceof DomainError)) throw error;
      context.addIssue({ code: 'custom', path: [...error.parameter], message: `must be ${error.allowed}` });
      return z.NEVER;
    }
  });

const MassList = z
  .strictObject({
    unit: z.string().meta({ examples: ['MeV'], maxLength: 64 }),
    values: z.array(z.number().positive()).min(1).max(MOST_MASSES),
  })
  .meta({ id: 'MassList', description: 'Masses in one unit, strictly increasing.' })
  .transform(({ unit, values }, context): number[] => {
    const at = values.findIndex((value, i) => i > 0 && !(value > values[i - 1]));
    if (at >= 0)
      context.addIssue({ code: 'custom', path: ['values', at], message: 'must be above the mass before it' });
    try {
      return values.map((value) => quantityOf(value, unit, KINDS.mass));
    } catch (error) {
      if (!(error instanceof QuantityError)) throw error;
      context.addIssue({ code: 'custom', path: ['unit'], message: error.message });
      return z.NEVER;
    }
  });

export const Reach = z
  .strictObject({
    scenario: ReachScenario,
    exposure: quantity('ReachExposure', KINDS.exposure, ABOVE_ZERO, 'Live mass × time.'),
    masses: z
      .union([MassRange, MassList], {
        error: () => 'must be {"from": …, "to": …, "count": …} or {"unit": …, "values": […]}',
      })
      .meta({ id: 'Masses', description: `At most ${MOST_MASSES} masses.` }),
  })
  .meta({ id: 'ReachRequest' })
  .transform(({ scenario, exposure, masses }): ReachIn => ({ scenario, exposureKgYr: exposure, massesMev: masses }));

export const ReachPointOut = z
  .strictObject({
    mass: quantityOut('MeV'),
    crossSection: estimateOut('cm^2')
      .nullable()
      .meta({ description: 'Smallest σ̄ₑ for which the goal holds; null where none does.' }),
    expectedSignal: z.number().nullable().meta({ description: 'Events in the window with that cross section.' }),
    expectedBackground: z.number(),
    binding: z.enum(['events', 'upper-limit', 'significance', 'minimum-events']).nullable(),
    band: z
      .strictObject({
        lowest: quantityOut('cm^2').nullable(),
        highest: quantityOut('cm^2').nullable().meta({ description: 'null where a table reaches nothing.' }),
        lowestCrystal: z.string().nullable().meta({ description: 'id of the table' }),
        highestCrystal: z.string().nullable(),
      })
      .optional()
      .meta({ description: 'With several tables; crossSection is that of the first.' }),
  })
  .meta({ id: 'ReachPoint' });
export type ReachPointOut = z.output<typeof ReachPointOut>;

export const ReachAnswer = z
  .strictObject({
    points: z.array(ReachPointOut),
    lightestMass: quantityOut('MeV').nullable().meta({
      description:
        'Exactly 2(E + δ)/v_max², E the lowest energy that feeds the window: nothing lighter is reached. null where the table ends below E.',
    }),
    best: z.strictObject({ mass: quantityOut('MeV'), crossSection: quantityOut('cm^2') }).nullable(),
    request: z.record(z.string(), z.unknown()).meta({
      description:
        'The request as it was understood: defaults filled in, units converted, tables by their ids. Comparisons tell from it what differs.',
    }),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({ id: 'ReachAnswer', description: 'Planning estimates.' });
export type ReachAnswer = z.output<typeof ReachAnswer>;

/** Last line of the answer as NDJSON: everything but the points. */
export type ReachSummary = Omit<ReachAnswer, 'points'>;
