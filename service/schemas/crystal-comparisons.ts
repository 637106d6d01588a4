/** POST /v1/crystals/{id}/comparisons: two tables under one scenario. */
import { z } from 'zod';
import { DEFAULT_HALO, Halo, type HaloIn } from './halo.ts';
import { DEFAULT_IONIZATION, Ionization, type IonizationIn } from './ionization.ts';
import { estimateOut, quantityOut } from './quantity.ts';
import { Notice, Provenance } from './rates.ts';
import { DarkMatter, type DarkMatterIn } from './scenario.ts';
import { Screening } from './screening.ts';

export interface ComparedScenarioIn {
  readonly darkMatter: DarkMatterIn;
  readonly halo: HaloIn;
  readonly screening: Screening;
  readonly ionization: IonizationIn;
}

export interface CrystalComparisonIn {
  readonly other: string;
  readonly scenario: ComparedScenarioIn;
}

/** Faults between sections. Runs on whatever could be read. */
function checkCompared(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const { ionization, darkMatter } = input as Partial<ComparedScenarioIn>;
  const gap = ionization?.bandGapEv;
  const splitting = darkMatter?.massSplittingEv;
  if (typeof gap !== 'number' || typeof splitting !== 'number' || splitting >= 0 || splitting > -gap) return;
  const message = `must be above minus the band gap, ${-gap} eV`;
  context.addIssue({ code: 'custom', path: ['darkMatter', 'massSplitting'], message });
}

const ComparedScenario = z
  .strictObject({
    darkMatter: DarkMatter,
    halo: Halo.optional(),
    screening: Screening,
    ionization: Ionization.optional(),
  })
  .superRefine(checkCompared, { when: () => true })
  .meta({
    id: 'ComparedScenario',
    description: 'What rates in a crystal depend on: a scenario without crystal, detector and goal.',
  })
  .transform(
    ({ darkMatter, halo, screening, ionization }): ComparedScenarioIn => ({
      darkMatter,
      halo: halo ?? DEFAULT_HALO,
      screening,
      ionization: ionization ?? DEFAULT_IONIZATION,
    }),
  );

export const CrystalComparison = z
  .strictObject({
    other: z
      .string()
      .max(100)
      .meta({ description: 'Id or alias of the table to compare with that of the URL.', examples: ['silicon'] }),
    scenario: ComparedScenario,
  })
  .meta({
    id: 'CrystalComparisonRequest',
    description: 'Gap and pair energy are the scenario’s, else those of the table in the URL, for both tables.',
  })
  .transform((request): CrystalComparisonIn => request);

const RATIO = z
  .number()
  .nullable()
  .meta({ description: 'Candidate over baseline; null where the baseline has no rate.' });
const estimate = estimateOut('1/(kg yr)');
const rate = quantityOut('1/(kg yr)');

const Side = z.strictObject({
  id: z.string(),
  screened: z.boolean().meta({ description: 'Whether screening is in the numbers that were compared.' }),
});

const ComparedBin = z
  .strictObject({
    electrons: z.int(),
    energy: z.strictObject({ unit: z.literal('eV'), from: z.number(), to: z.number() }),
    baseline: estimate,
    candidate: estimate,
    ratio: RATIO,
  })
  .meta({ id: 'ComparedBin' });

const Block = z
  .strictObject({
    momentum: z.strictObject({ unit: z.literal('keV'), from: z.number(), to: z.number() }),
    energy: z.strictObject({ unit: z.literal('eV'), from: z.number(), to: z.number() }),
    baseline: rate,
    candidate: rate,
    difference: rate.meta({ description: 'Candidate minus baseline.' }),
    share: z.number().meta({
      description:
        'The difference over the whole rate above the gap: the baseline’s, or the candidate’s where that is 0.',
    }),
  })
  .meta({ id: 'DifferenceBlock', description: 'A region of momentum and energy, and what it adds to either rate.' });

export const CrystalComparisonAnswer = z
  .strictObject({
    baseline: Side.meta({ id: 'ComparedTable', description: 'The table of the URL.' }),
    candidate: Side.meta({ description: 'The other table.' }),
    bins: z.array(ComparedBin),
    total: z.strictObject({ baseline: estimate, candidate: estimate, ratio: RATIO }).meta({
      description: 'Sums of the bins.',
    }),
    aboveGap: z.strictObject({ baseline: rate, candidate: rate, ratio: RATIO }).meta({
      description: 'Rates of all energies above the gap, whatever charge they free.',
    }),
    blocks: z.array(Block).meta({
      description:
        'Where the difference is made, the largest first. Regions add up to aboveGap; those that are the same in both tables are left out.',
    }),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({ id: 'CrystalComparison', description: 'Planning estimates.' });
export type CrystalComparisonAnswer = z.output<typeof CrystalComparisonAnswer>;
