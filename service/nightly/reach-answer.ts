/**
 * What the nightly job needs of an answer of POST /v1/reach, tonight's or one of the history. Fields beyond these are kept and not
 * judged: another version of the service may have more.
 */
import { z } from 'zod';
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';

const MassOut = z.looseObject({ value: z.number().positive(), unit: z.literal('MeV') });
const CrossSectionOut = z.looseObject({
  value: z.number().positive(),
  unit: z.literal('cm^2'),
  relativeError: z.number().optional(),
});

export const NightlyReach = z.looseObject({
  points: z
    .array(
      z.looseObject({
        mass: MassOut,
        crossSection: CrossSectionOut.nullable(),
        expectedSignal: z.number().nullish(),
        expectedBackground: z.number().nullish(),
        band: z.looseObject({ lowest: CrossSectionOut.nullable(), highest: CrossSectionOut.nullable() }).optional(),
      }),
    )
    .min(1),
  lightestMass: MassOut.nullable(),
  request: z.record(z.string(), z.unknown()),
  provenance: z.looseObject({
    service: z.looseObject({ version: z.string() }),
    constants: z.looseObject({ codata: z.number() }),
  }),
});
export type NightlyReach = z.output<typeof NightlyReach>;

export function curveOf({ points }: NightlyReach): CurvePoint[] {
  return points.map(({ mass, crossSection }) => ({
    massMev: mass.value,
    crossSectionCm2: crossSection?.value ?? null,
  }));
}

/** The two edges of the band that several tables make; undefined for a single table. */
export function bandEdgesOf({ points }: NightlyReach): Record<'lowest' | 'highest', CurvePoint[]> | undefined {
  if (points.some(({ band }) => band === undefined)) return undefined;
  const edge = (side: 'lowest' | 'highest'): CurvePoint[] =>
    points.map(({ mass, band }) => ({ massMev: mass.value, crossSectionCm2: band![side]?.value ?? null }));
  return { lowest: edge('lowest'), highest: edge('highest') };
}
