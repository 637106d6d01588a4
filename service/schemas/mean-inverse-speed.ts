/** POST /v1/halo/mean-inverse-speed: what comes in and what goes out. */
import { z } from 'zod';
import { KINDS, QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';
import { DEFAULT_HALO, Halo } from './halo.ts';
import { quantitiesOut, quantityOut } from './quantity.ts';

const MOST_SPEEDS = 10_000;

const Speeds = z
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

export const MeanInverseSpeedIn = z
  .strictObject({ halo: Halo.optional(), speeds: Speeds })
  .meta({ id: 'MeanInverseSpeedRequest' })
  .transform(({ halo, speeds }) => ({ halo: halo ?? DEFAULT_HALO, speedsKmPerS: speeds }));

export const MeanInverseSpeedAnswer = z
  .strictObject({
    meanInverseSpeed: quantitiesOut('s/km').meta({
      description: 'η(v_min) at each speed, in the order of the speeds; closed form, 1e-9 relative.',
    }),
    meanSpeed: quantityOut('km/s').meta({ description: 'Mean speed in the laboratory.' }),
    largestSpeed: quantityOut('km/s').meta({ description: 'v_esc + v_E: η is 0 from here on.' }),
  })
  .meta({ id: 'MeanInverseSpeedAnswer' });
