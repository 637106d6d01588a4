/** POST /v1/comparisons: two reach curves against each other. */
import { z } from 'zod';
import { estimateOut, quantityOut } from './quantity.ts';
import { Notice, Provenance } from './rates.ts';
import { Reach, ReachAnswer, type ReachIn } from './reach.ts';

/** A finished answer, or what is needed of one: points of its own making are compared too. */
const FinishedReach = z
  .strictObject({
    points: z
      .array(
        z
          .strictObject({
            mass: quantityOut('MeV'),
            crossSection: z.union([estimateOut('cm^2'), quantityOut('cm^2')]).nullable(),
          })
          .loose(),
      )
      .min(1)
      .max(1000),
    request: ReachAnswer.shape.request.optional(),
    lightestMass: ReachAnswer.shape.lightestMass.optional(),
    best: ReachAnswer.shape.best.optional(),
    notices: z.array(z.unknown()).optional(),
    provenance: z.unknown().optional(),
  })
  .superRefine(({ points }, context) => {
    points.forEach(({ mass, crossSection }, i) => {
      if (!(mass.value > 0))
        context.addIssue({ code: 'custom', path: ['points', i, 'mass', 'value'], message: 'must be above 0' });
      if (crossSection && !(crossSection.value > 0)) {
        context.addIssue({
          code: 'custom',
          path: ['points', i, 'crossSection', 'value'],
          message: 'must be above 0, or crossSection null',
        });
      }
    });
  })
  .meta({ id: 'FinishedReach', description: 'An answer of POST /v1/reach.' });
export type FinishedReach = z.output<typeof FinishedReach>;

const Side = z
  .union([Reach, FinishedReach], { error: () => 'must be a reach request or the answer of one' })
  .meta({ id: 'ComparisonSide', description: 'A reach request, or the finished answer of one.' });
export type SideIn = ReachIn | FinishedReach;

export interface ComparisonIn {
  readonly baseline: SideIn;
  readonly candidate: SideIn;
  readonly tolerance: number;
}

export const Comparison = z
  .strictObject({
    baseline: Side,
    candidate: Side,
    tolerance: z
      .number()
      .min(0)
      .max(1e6)
      .default(0.05)
      .meta({ description: '"same" means |ln ratio| ≤ ln(1 + tolerance) everywhere.' }),
  })
  .meta({ id: 'ComparisonRequest' });

const RatioAt = z.strictObject({ mass: quantityOut('MeV'), ratio: z.number() });

const OneSided = z.strictObject({
  mass: quantityOut('MeV'),
  crossSection: quantityOut('cm^2'),
  reason: z.enum(['unreachable', 'undecided', 'outside']).meta({
    description: 'The other side does not reach this mass; ends between its masses here; or has no masses here.',
  }),
});

export const ComparisonAnswer = z
  .strictObject({
    verdict: z.enum(['better', 'same', 'worse', 'mixed']),
    points: z
      .array(
        z.strictObject({
          mass: quantityOut('MeV'),
          ratio: z.number().nullable().meta({
            description: 'Candidate over baseline cross section, below 1 is better; null where either has none.',
          }),
          interpolated: z
            .enum(['baseline', 'candidate'])
            .optional()
            .meta({ description: 'The side whose grid lacks this mass: log–log between its neighbours.' }),
        }),
      )
      .meta({ description: 'The masses of both in their common range.' }),
    largest: z.strictObject({ gain: RatioAt.nullable(), loss: RatioAt.nullable() }),
    onlyBaseline: z.array(OneSided),
    onlyCandidate: z.array(OneSided),
    differences: z
      .array(
        z.strictObject({
          op: z.string(),
          path: z.string(),
          from: z.string().optional(),
          value: z.unknown().optional(),
        }),
      )
      .meta({
        description:
          'JSON Patch (RFC 6902) from the baseline’s request to the candidate’s, as they were understood; empty where either is not known.',
      }),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({ id: 'ComparisonAnswer' });
export type ComparisonAnswer = z.output<typeof ComparisonAnswer>;
