/** A list of speeds in one unit. */
import { z } from 'zod';
import { KINDS, QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';

const MOST_SPEEDS = 10_000;

export const Speeds = z
  .strictObject({
    unit: z.string().meta({ examples: ['km/s'], maxLength: 64 }),
    values: z.array(z.number().min(0)).min(1).max(MOST_SPEEDS),
  })
  .meta({ id: 'Speeds', description: `Speeds of at least 0 in one unit, at most ${MOST_SPEEDS}.` })
  .transform((input, context): number[] => {
    try {
      const factor = quantityOf(1, input.unit, KINDS.speed);
      const speeds = input.values.map((value) => value * factor);
      speeds.forEach((speed, i) => {
        if (speed === Infinity)
          context.addIssue({ code: 'custom', path: ['values', i], message: 'is beyond all that can be held' });
      });
      return speeds;
    } catch (error) {
      if (!(error instanceof QuantityError)) throw error;
      context.addIssue({ code: 'custom', path: ['unit'], message: error.message });
      return z.NEVER;
    }
  });
