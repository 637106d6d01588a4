/** What an answer tells of a halo. */
import { z } from 'zod';
import { quantityOut } from './quantity.ts';

export const HaloOut = z
  .strictObject({
    localDensity: quantityOut('GeV/cm^3'),
    laboratorySpeed: quantityOut('km/s').optional(),
    meanSpeed: quantityOut('km/s').meta({ description: 'In the laboratory.' }),
    largestSpeed: quantityOut('km/s').meta({ description: 'In the laboratory.' }),
  })
  .meta({ id: 'HaloFacts', description: 'The halo as it was understood.' });
export type HaloOut = z.output<typeof HaloOut>;
