/** Velocities in the galactic frame: U towards the centre, V with the rotation, W towards the north pole. */
import { z } from 'zod';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../physics/constants.ts';
import { type GalacticVelocity, speedOf } from '../../physics/halo/galactic-velocity.ts';
import { QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';
import { ANY_SIGN, AT_LEAST_ZERO, KINDS, quantity } from './quantity.ts';

const FORM = 'must be {"unit": "km/s", "values": [U, V, W]} or three speeds with their units';

const component = quantity('VelocityComponent', KINDS.speed, ANY_SIGN, 'One component of a velocity.');

const three = z
  .strictObject({
    unit: z.string().meta({ examples: ['km/s'], maxLength: 64 }),
    values: z.array(z.number()).length(3),
  })
  .transform(({ unit, values }, context): number[] => {
    try {
      return values.map((value) => quantityOf(value, unit, KINDS.speed));
    } catch (error) {
      if (!(error instanceof QuantityError)) throw error;
      context.addIssue({ code: 'custom', path: ['unit'], message: error.message });
      return z.NEVER;
    }
  });

export const Velocity = z
  .union([three, z.array(component).length(3)], { error: () => FORM })
  .meta({ id: 'GalacticVelocity', description: 'U, V, W in the galactic frame, together below the speed of light.' })
  .transform(([u, v, w], context): GalacticVelocity => {
    const velocity: GalacticVelocity = [u, v, w];
    if (!(speedOf(velocity) < SPEED_OF_LIGHT_KM_PER_S))
      context.addIssue({ code: 'custom', message: 'must be below the speed of light' });
    return velocity;
  });

/** One dispersion, or three along U, V, W. */
export const Dispersion = z
  .union(
    [
      quantity(
        'Dispersion',
        KINDS.speed,
        AT_LEAST_ZERO,
        'One-dimensional dispersion σ; v₀ = √2 σ; 0 is a cold stream.',
      ),
      three,
      z.array(component).length(3),
    ],
    { error: () => 'must be a speed with its unit, or three of them along U, V, W' },
  )
  .meta({ id: 'DispersionOrThree', description: 'σ, one for all directions or along U, V, W (within a factor 10).' })
  .transform((sigma): number | GalacticVelocity =>
    typeof sigma === 'number' ? sigma : [sigma[0], sigma[1], sigma[2]],
  );
