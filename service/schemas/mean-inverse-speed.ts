/** POST /v1/halo/mean-inverse-speed: what comes in and what goes out. */
import { z } from 'zod';
import { DEFAULT_HALO, Halo, type HaloIn } from './halo.ts';
import { quantitiesOut, quantityOut } from './quantity.ts';
import { Speeds } from './speeds.ts';

export interface MeanInverseSpeedRequest {
  readonly halo: HaloIn;
  readonly speedsKmPerS: readonly number[];
  readonly speedDistribution: boolean;
}

export const MeanInverseSpeedIn = z
  .strictObject({
    halo: Halo.optional(),
    speeds: Speeds,
    speedDistribution: z
      .boolean()
      .default(false)
      .meta({ description: 'Adds the distribution of speeds f(v) at the speeds.' }),
  })
  .meta({ id: 'MeanInverseSpeedRequest' })
  .transform(
    ({ halo, speeds, speedDistribution }): MeanInverseSpeedRequest => ({
      halo: halo ?? DEFAULT_HALO,
      speedsKmPerS: speeds,
      speedDistribution,
    }),
  );

export const MeanInverseSpeedAnswer = z
  .strictObject({
    meanInverseSpeed: quantitiesOut('s/km').meta({
      description:
        'η(v_min) at each speed, in the order of the speeds; the standard model in closed form, 1e-9 relative.',
    }),
    speedDistribution: quantitiesOut('s/km').optional().meta({
      description:
        'f(v) = −v dη/dv in the laboratory, ∫ f dv = 1. The spike of a component without dispersion is not in it.',
    }),
    meanSpeed: quantityOut('km/s').meta({ description: 'Mean speed in the laboratory.' }),
    largestSpeed: quantityOut('km/s').meta({ description: 'v_esc + v_E in the standard model: η is 0 from here on.' }),
    localDensity: quantityOut('GeV/cm^3').optional().meta({
      description: 'With a model other than the standard one, or with the distribution of speeds.',
    }),
    laboratorySpeed: quantityOut('km/s').optional().meta({ description: 'v_E, where a date or a velocity sets it.' }),
    normalisation: z.number().optional().meta({
      description: 'With the model "tabulated": the integral by which the values, per km/s, were divided.',
    }),
  })
  .meta({ id: 'MeanInverseSpeedAnswer' });
