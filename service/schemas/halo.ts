/** The dark-matter halo as the laboratory meets it. */
import { z } from 'zod';
import { ABOVE_ZERO, KINDS, quantity, SPEED_ABOVE_ZERO, SPEED_AT_LEAST_ZERO } from './quantity.ts';

export interface HaloIn {
  readonly localDensityGevPerCm3: number;
  readonly circularSpeedKmPerS: number;
  readonly escapeSpeedKmPerS: number;
  readonly laboratorySpeedKmPerS: number;
  readonly cutoff: 'sharp' | 'smooth';
}

/** Defaults: Baxter et al., Eur. Phys. J. C 81, 907 (2021); 250 km/s stands for the Sun's own speed. */
export const Halo = z
  .strictObject({
    localDensity: quantity('LocalDensity', KINDS.density, ABOVE_ZERO, 'Local density ρ of dark matter.').default(0.3),
    circularSpeed: quantity('CircularSpeed', KINDS.speed, SPEED_ABOVE_ZERO, 'Circular speed v₀.').default(238),
    escapeSpeed: quantity('EscapeSpeed', KINDS.speed, SPEED_ABOVE_ZERO, 'Escape speed v_esc.').default(544),
    laboratorySpeed: quantity(
      'LaboratorySpeed',
      KINDS.speed,
      SPEED_AT_LEAST_ZERO,
      'Speed v_E of the laboratory through the halo.',
    ).default(250),
    cutoff: z.enum(['sharp', 'smooth']).default('sharp').meta({
      description: 'sharp: f ∝ exp(−v²/v₀²) below v_esc; smooth: f ∝ exp(−v²/v₀²) − exp(−v_esc²/v₀²).',
    }),
  })
  .meta({
    id: 'Halo',
    description: 'Standard Halo Model; every field optional. Defaults: 0.3 GeV/cm^3, 238, 544 and 250 km/s, sharp.',
  })
  .transform(
    (halo): HaloIn => ({
      localDensityGevPerCm3: halo.localDensity,
      circularSpeedKmPerS: halo.circularSpeed,
      escapeSpeedKmPerS: halo.escapeSpeed,
      laboratorySpeedKmPerS: halo.laboratorySpeed,
      cutoff: halo.cutoff,
    }),
  );

/** What stands where a request has no halo. */
export const DEFAULT_HALO: HaloIn = Halo.parse({});
