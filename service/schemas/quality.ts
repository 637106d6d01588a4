/** The quality report of a table: what it must satisfy whoever made it, asked of the table itself. */
import { z } from 'zod';
import { quantitiesOut, quantityOut } from './quantity.ts';

const GRADE = z.enum(['fine', 'look', 'wrong']).meta({
  description: 'fine: as it should be. look: may be right; a reader should know. wrong: do not believe rates from it.',
});

const Finding = z
  .strictObject({
    code: z.string().meta({ description: 'Stable name of what was asked.' }),
    grade: GRADE,
    detail: z.string().meta({ description: 'One sentence with its numbers.' }),
  })
  .meta({ id: 'Finding' });

function coverage(unit: 'keV' | 'eV') {
  return z.strictObject({
    unit: z.literal(unit),
    kind: z.enum(['edges', 'points']),
    count: z.int().meta({ description: 'How many numbers the axis has.' }),
    from: z.number(),
    to: z.number(),
    smallestStep: z.number(),
    largestStep: z.number(),
  });
}

const SumRule = z
  .strictObject({
    momentum: quantitiesOut('keV').meta({ description: 'Middle of each cell, or each sample above 0.' }),
    share: z.array(z.number().nullable()).meta({
      description: '∫ E |f|² dE at each momentum, over N q⁵/(4 α mₑ³) for the N = electronsPerCell electrons.',
    }),
    nearOne: z.strictObject({ unit: z.literal('keV'), from: z.number(), to: z.number() }).meta({
      description: 'Momenta at which the share should be near 1 if the electrons respond below the last energy.',
    }),
    electronsFound: z.number().nullable().meta({
      description: 'Electrons per cell that the strength comes to there; null where no momentum lies there.',
    }),
  })
  .meta({ id: 'SumRule', description: 'The f-sum rule.' });

const OpticalLimit = z
  .strictObject({
    momentum: quantityOut('keV').meta({ description: 'The lowest reliable momentum, at which it was read.' }),
    staticDielectric: z.strictObject({ value: z.number(), from: z.number(), to: z.number() }).nullable().meta({
      description:
        'ε(0) by Kramers–Kronig, and the range it may have for strength above the table; null where the numbers allow none.',
    }),
    plasmon: quantityOut('eV').nullable().meta({
      description: 'Energy of the highest loss Im[−1/ε]; null where the table ends before a peak.',
    }),
  })
  .meta({ id: 'OpticalLimit', description: 'Small momenta, where handbooks can be asked.' });

const Masses = z
  .strictObject({
    mediator: z.enum(['heavy', 'light']),
    from: quantityOut('MeV').meta({ description: 'The lightest that frees an electron.' }),
    to: quantityOut('MeV').nullable().meta({ description: 'The heaviest that is covered, to 10 %; null if all are.' }),
    limit: z.enum(['momentum', 'energy']).nullable().meta({ description: 'Which end of the table comes first.' }),
    lowerMomentumShare: z.number().meta({
      description: 'Largest share of the rate next to the first momentum, where the halo allows smaller ones.',
    }),
  })
  .meta({ id: 'MassCoverage', description: 'Masses for which the table covers what the standard halo allows.' });

export const Quality = z
  .strictObject({
    verdict: GRADE.meta({ description: 'The worst grade of all findings.' }),
    findings: z.array(Finding),
    coverage: z.strictObject({ momentum: coverage('keV'), energy: coverage('eV') }),
    sumRule: SumRule.nullable().meta({ description: 'null where the table does not give electronsPerCell.' }),
    onset: quantityOut('eV').nullable().meta({ description: 'The lowest energy with strength; null without any.' }),
    opticalLimit: OpticalLimit.nullable().meta({
      description: 'null without a cell volume, or where no row at small momentum is reliable.',
    }),
    roughness: z
      .strictObject({
        perCell: z.number().nullable(),
        perBin: z.number().nullable().meta({ description: 'null without energyPerPair.' }),
      })
      .meta({
        description:
          'Relative noise of one cell (median), and about what is left of it in the rate of an electron bin.',
      }),
    masses: z.array(Masses).meta({ description: 'Empty where rates make no sense.' }),
  })
  .meta({
    id: 'Quality',
    description: 'The quality report. Masses are judged with the halo that a request without one has.',
  });
export type Quality = z.output<typeof Quality>;
