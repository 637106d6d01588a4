/** Velocity distributions beyond the standard model, as they come in. */
import { z } from 'zod';
import type { GalacticVelocity } from '../../physics/halo/galactic-velocity.ts';
import { Dispersion, Velocity } from './galactic-velocity.ts';
import { KINDS, quantity, SPEED_ABOVE_ZERO } from './quantity.ts';
import { Speeds } from './speeds.ts';

const MOST_COMPONENTS = 20;
const MOST_POINTS = 10_000;

export interface ComponentIn {
  readonly weight: number;
  readonly dispersionKmPerS: number | GalacticVelocity;
  readonly meanVelocityKmPerS: GalacticVelocity;
  /** undefined: the halo's. */
  readonly escapeSpeedKmPerS: number | undefined;
}

const Component = z
  .strictObject({
    weight: z.number().positive().max(1e9).default(1).meta({
      description: 'Share of the local density, relative to the other components’.',
    }),
    dispersion: Dispersion,
    meanVelocity: Velocity.optional().meta({ description: 'In the galactic frame; default: at rest.' }),
    escapeSpeed: quantity(
      'ComponentEscapeSpeed',
      KINDS.speed,
      SPEED_ABOVE_ZERO,
      'Where it is cut, about the galaxy’s rest frame; default: the halo’s.',
    ).optional(),
  })
  .meta({ id: 'HaloComponent', description: 'A Gaussian of velocities, isotropic or not, at rest or not, cut.' })
  .transform(
    ({ weight, dispersion, meanVelocity, escapeSpeed }): ComponentIn => ({
      weight,
      dispersionKmPerS: dispersion,
      meanVelocityKmPerS: meanVelocity ?? [0, 0, 0],
      escapeSpeedKmPerS: escapeSpeed,
    }),
  );

export const Components = z.array(Component).min(1).max(MOST_COMPONENTS);

export interface TabulatedIn {
  readonly kind: 'galactic' | 'laboratory' | 'meanInverseSpeed';
  readonly speedsKmPerS: readonly number[];
  readonly values: readonly number[];
}

export const Tabulated = z
  .strictObject({
    kind: z.enum(['galactic', 'laboratory', 'meanInverseSpeed']).meta({
      description:
        'galactic: f(v) in the galactic frame, isotropic there; laboratory: f(v) in the laboratory; meanInverseSpeed: η(v_min) itself.',
    }),
    speeds: Speeds,
    values: z.array(z.number().min(0)).min(2).max(MOST_POINTS).meta({
      description: 'One for each speed, in any unit: they are divided by their integral over speed.',
    }),
  })
  .meta({
    id: 'TabulatedHalo',
    description: 'A distribution as a table: straight between the points, nothing outside.',
  })
  .transform(({ kind, speeds, values }): TabulatedIn => ({ kind, speedsKmPerS: speeds, values }));
