/** What an exposure is to achieve. */
import { z } from 'zod';

const Window = z
  .strictObject({ from: z.int().min(1).max(100), to: z.int().min(1).max(100) })
  .refine((w) => !(typeof w?.from === 'number' && typeof w.to === 'number' && w.from > w.to), {
    when: () => true,
    path: ['to'],
    message: 'must not be below "from"',
  })
  .meta({ id: 'Window', description: 'Measured electrons that count, both ends included; default all bins from 1.' });

const probability = z
  .number()
  .gt(0)
  .lt(1)
  .meta({ examples: [0.9] });

const common = {
  window: Window.optional(),
  check: z
    .strictObject({ experiments: z.int().min(100).max(1_000_000), seed: z.int().min(0) })
    .optional()
    .meta({ description: 'Simulated experiments at the needed exposure, beside the formula.' }),
};

export const Goal = z
  .discriminatedUnion(
    'kind',
    [
      z
        .strictObject({ kind: z.literal('events'), count: z.number().positive().max(1e12), ...common })
        .meta({ id: 'EventsGoal', description: 'So many signal events expected.' }),
      z
        .strictObject({ kind: z.literal('detection'), atLeast: z.int().min(1).max(1_000_000), probability, ...common })
        .meta({ id: 'DetectionGoal', description: 'At least so many signal events with this probability (Poisson).' }),
      z
        .strictObject({
          kind: z.literal('exclusion'),
          confidence: probability,
          method: z
            .enum(['counting', 'unified', 'likelihood'])
            .default('counting')
            .meta({
              description:
                'counting: mean CLs upper limit of the summed window; unified: mean Feldman–Cousins upper limit of the summed window ' +
                '(confidence from 0.5); likelihood: bins separately, median CLs, profiled over uncertain backgrounds.',
            }),
          ...common,
        })
        .meta({
          id: 'ExclusionGoal',
          description:
            'Excluding the scenario if there is no signal; without background −ln(1 − confidence) expected events.',
        }),
      z
        .strictObject({
          kind: z.literal('discovery'),
          significance: z.number().positive().max(100).meta({ description: 'One-sided, σ.' }),
          minimumEvents: z.number().positive().max(1e12).default(3),
          ...common,
        })
        .meta({
          id: 'DiscoveryGoal',
          description: 'Median significance over the backgrounds, bins separately, and a minimum of signal events.',
        }),
    ],
    { error: () => 'must be "events", "detection", "exclusion" or "discovery"' },
  )
  .meta({ id: 'Goal', description: 'What the exposure is to achieve.' });
export type GoalIn = z.output<typeof Goal>;
