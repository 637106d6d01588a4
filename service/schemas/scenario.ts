/** A scenario: what is searched for, with which crystal and charge response, to which goal. */
import { z } from 'zod';
import type { Mediator } from '../../physics/mediator/mediator.ts';
import type { CrystalInput } from './crystal.ts';
import { CrystalTableIn } from './crystal.ts';
import { DEFAULT_HALO, Halo, type HaloIn } from './halo.ts';
import { ABOVE_ZERO, ANY_SIGN, AT_LEAST_ZERO, KINDS, quantity } from './quantity.ts';

export interface DarkMatterIn {
  readonly massMev: number;
  readonly referenceCrossSectionCm2: number;
  readonly mediator: Mediator;
  readonly massSplittingEv: number;
}

const MediatorIn = z
  .union(
    [
      z.enum(['heavy', 'light']),
      z.strictObject({ mass: quantity('MediatorMass', KINDS.mediatorMass, ABOVE_ZERO, 'Mass of the mediator.') }),
    ],
    { error: () => 'must be "heavy", "light" or {"mass": "30 keV"}' },
  )
  .meta({
    id: 'Mediator',
    description: 'heavy: |F|² = 1; light: |F|² = (α mₑ/q)⁴; a mass m: F = (m² + α²mₑ²)/(m² + q²).',
  })
  .transform(
    (input): Mediator => (typeof input === 'string' ? { kind: input } : { kind: 'massive', massEv: input.mass * 1e3 }),
  );

const DarkMatter = z
  .strictObject({
    mass: quantity('DarkMatterMass', KINDS.mass, ABOVE_ZERO, 'Mass m_χ of the particle.'),
    referenceCrossSection: quantity(
      'ReferenceCrossSection',
      KINDS.crossSection,
      ABOVE_ZERO,
      'Cross section σ̄ₑ with a free electron at q = α mₑ.',
    ),
    mediator: MediatorIn,
    massSplitting: quantity(
      'MassSplitting',
      KINDS.energy,
      ANY_SIGN,
      'δ > 0 up-, δ < 0 down-scattering; above minus the band gap.',
    ).default(0),
  })
  .meta({ id: 'DarkMatter', description: 'The dark-matter hypothesis. massSplitting defaults to 0 eV.' })
  .transform(
    (dm): DarkMatterIn => ({
      massMev: dm.mass,
      referenceCrossSectionCm2: dm.referenceCrossSection,
      mediator: dm.mediator,
      massSplittingEv: dm.massSplitting,
    }),
  );

const CrystalReference = z
  .strictObject({
    id: z
      .string()
      .max(100)
      .meta({ examples: ['silicon'] }),
  })
  .meta({ id: 'CrystalReference', description: 'A stored table by id or alias.' });

/** A stored table or one inline. */
export const Crystal = z
  .union([CrystalReference, CrystalTableIn], { error: () => 'must be {"id": "…"} of a stored table, or a whole table' })
  .meta({ id: 'Crystal' });
export type CrystalIn = { readonly id: string } | CrystalInput;

export interface IonizationIn {
  readonly bandGapEv: number | undefined;
  readonly energyPerPairEv: number | undefined;
  readonly maxElectrons: number;
}

const Ionization = z
  .strictObject({
    bandGap: quantity('IonizationBandGap', KINDS.energy, AT_LEAST_ZERO, 'Band gap; default: the table’s.').optional(),
    energyPerPair: quantity(
      'IonizationEnergyPerPair',
      KINDS.energy,
      ABOVE_ZERO,
      'Mean energy per electron; default: the table’s.',
    ).optional(),
    maxElectrons: z.int().min(1).max(100).default(15).meta({ description: 'Last electron bin returned.' }),
  })
  .refine(
    (i) => !(typeof i?.bandGap === 'number' && typeof i.energyPerPair === 'number' && i.energyPerPair < i.bandGap),
    {
      when: () => true,
      path: ['energyPerPair'],
      message: 'must be at least the band gap',
    },
  )
  .meta({
    id: 'Ionization',
    description: 'E frees n = 1 + floor((E − bandGap)/energyPerPair) electrons, nothing below the gap.',
  })
  .transform(
    (i): IonizationIn => ({ bandGapEv: i.bandGap, energyPerPairEv: i.energyPerPair, maxElectrons: i.maxElectrons }),
  );

const Window = z
  .strictObject({ from: z.int().min(1).max(100), to: z.int().min(1).max(100) })
  .refine((w) => !(typeof w?.from === 'number' && typeof w.to === 'number' && w.from > w.to), {
    when: () => true,
    path: ['to'],
    message: 'must not be below "from"',
  })
  .meta({ id: 'Window', description: 'Electron bins that count, both ends included; default all of them.' });

const probability = z.number().gt(0).lt(1);

const Goal = z
  .discriminatedUnion(
    'kind',
    [
      z
        .strictObject({ kind: z.literal('events'), count: z.number().positive().max(1e12), window: Window.optional() })
        .meta({
          id: 'EventsGoal',
          description: 'So many events expected.',
        }),
      z
        .strictObject({
          kind: z.literal('detection'),
          atLeast: z.int().min(1).max(1_000_000),
          probability: probability.meta({ examples: [0.9] }),
          window: Window.optional(),
        })
        .meta({ id: 'DetectionGoal', description: 'At least so many events with this probability (Poisson).' }),
      z
        .strictObject({
          kind: z.literal('exclusion'),
          confidence: probability.meta({ examples: [0.9] }),
          window: Window.optional(),
        })
        .meta({
          id: 'ExclusionGoal',
          description:
            'Excluding the scenario at this confidence if nothing is seen: −ln(1 − confidence) expected events.',
        }),
    ],
    { error: () => 'must be "events", "detection" or "exclusion"' },
  )
  .meta({ id: 'Goal', description: 'What the exposure is to achieve.' });
export type GoalIn = z.output<typeof Goal>;

export interface ScenarioIn {
  readonly darkMatter: DarkMatterIn;
  readonly halo: HaloIn;
  readonly crystal: CrystalIn;
  readonly ionization: IonizationIn;
  readonly goal: GoalIn | undefined;
  readonly spectrum: boolean;
}

/** Faults between sections; runs on whatever could be read. */
function checkScenario(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const { ionization, goal, darkMatter } = input as Partial<ScenarioIn>;
  const last = ionization === undefined ? DEFAULT_IONIZATION.maxElectrons : ionization?.maxElectrons;
  const to = (goal as { window?: { to?: unknown } } | undefined)?.window?.to;
  if (typeof last === 'number' && typeof to === 'number' && to > last) {
    context.addIssue({
      code: 'custom',
      path: ['goal', 'window', 'to'],
      message: `is beyond the last bin, maxElectrons = ${last}`,
    });
  }
  const gap = ionization?.bandGapEv;
  const splitting = darkMatter?.massSplittingEv;
  if (typeof gap === 'number' && typeof splitting === 'number' && splitting < 0 && splitting <= -gap) {
    context.addIssue({
      code: 'custom',
      path: ['darkMatter', 'massSplitting'],
      message: `must be above minus the band gap, ${-gap} eV`,
    });
  }
}

const DEFAULT_IONIZATION: IonizationIn = Ionization.parse({});

export const Scenario = z
  .strictObject({
    darkMatter: DarkMatter,
    halo: Halo.optional(),
    crystal: Crystal,
    ionization: Ionization.optional(),
    goal: Goal.optional(),
    spectrum: z.boolean().default(false).meta({ description: 'Adds dR/dE on the table’s energy axis.' }),
  })
  .superRefine(checkScenario, { when: () => true })
  .meta({ id: 'Scenario', description: 'A scenario. Without a goal the answer has rates only.' })
  .transform(
    (scenario): ScenarioIn => ({
      ...scenario,
      halo: scenario.halo ?? DEFAULT_HALO,
      ionization: scenario.ionization ?? DEFAULT_IONIZATION,
      goal: scenario.goal,
    }),
  );
