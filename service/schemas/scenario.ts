/** A scenario: what is searched for, with which crystal and charge response, to which goal. */
import { z } from 'zod';
import type { Mediator } from '../../physics/mediator/mediator.ts';
import type { CrystalInput } from './crystal.ts';
import { CrystalTableIn } from './crystal.ts';
import { type BackgroundIn, Backgrounds, Payload, type PayloadStage, Readout, type ReadoutIn } from './detector.ts';
import { Goal, type GoalIn } from './goal.ts';
import { DEFAULT_HALO, Halo, type HaloIn } from './halo.ts';
import { DEFAULT_IONIZATION, Ionization, type IonizationIn } from './ionization.ts';
import { ABOVE_ZERO, ANY_SIGN, KINDS, quantity } from './quantity.ts';
import { Screening } from './screening.ts';

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

const MassSplitting = quantity(
  'MassSplitting',
  KINDS.energy,
  ANY_SIGN,
  'δ > 0 up-, δ < 0 down-scattering; above minus the band gap.',
).default(0);

export const DarkMatter = z
  .strictObject({
    mass: quantity('DarkMatterMass', KINDS.mass, ABOVE_ZERO, 'Mass m_χ of the particle.'),
    referenceCrossSection: quantity(
      'ReferenceCrossSection',
      KINDS.crossSection,
      ABOVE_ZERO,
      'Cross section σ̄ₑ with a free electron at q = α mₑ.',
    ),
    mediator: MediatorIn,
    massSplitting: MassSplitting,
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
const Crystal = z
  .union([CrystalReference, CrystalTableIn], { error: () => 'must be {"id": "…"} of a stored table, or a whole table' })
  .meta({ id: 'Crystal' });
export type CrystalIn = { readonly id: string } | CrystalInput;

export interface ScenarioIn {
  readonly darkMatter: DarkMatterIn;
  readonly halo: HaloIn;
  readonly crystal: CrystalIn;
  readonly screening: Screening;
  readonly ionization: IonizationIn;
  readonly readout: ReadoutIn | undefined;
  readonly backgrounds: readonly BackgroundIn[];
  readonly goal: GoalIn | undefined;
  readonly payload: readonly PayloadStage[] | undefined;
  readonly spectrum: boolean;
}

/** Faults between sections; runs on whatever could be read, so every step is taken with care. */
export function checkScenario(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const {
    ionization = DEFAULT_IONIZATION,
    goal,
    darkMatter,
    readout,
    backgrounds,
    payload,
  } = input as Partial<ScenarioIn>;
  const issue = (path: (string | number)[], message: string): void =>
    context.addIssue({ code: 'custom', path, message });
  const last = ionization?.maxElectrons;
  if (typeof last === 'number') {
    for (const end of ['from', 'to'] as const) {
      const electrons = goal?.window?.[end];
      if (typeof electrons === 'number' && electrons > last)
        issue(['goal', 'window', end], `is beyond the last bin, maxElectrons = ${last}`);
    }
    const efficiency = readout?.efficiency;
    if (Array.isArray(efficiency) && efficiency.length !== last + 1) {
      issue(
        ['readout', 'efficiency'],
        `has ${efficiency.length} numbers; the measured bins 0…${last} need ${last + 1}`,
      );
    }
  }
  const gap = ionization?.bandGapEv;
  const splitting = darkMatter?.massSplittingEv;
  if (typeof gap === 'number' && typeof splitting === 'number' && splitting < 0 && splitting <= -gap) {
    issue(['darkMatter', 'massSplitting'], `must be above minus the band gap, ${-gap} eV`);
  }
  if (Array.isArray(backgrounds)) checkBackgrounds(backgrounds, goal, last, issue);
  if (goal?.kind === 'exclusion' && goal.method === 'unified' && goal.confidence < 0.5) {
    issue(['goal', 'confidence'], 'must be at least 0.5 with the method "unified"');
  }
  if (payload !== undefined && goal === undefined) issue(['payload'], 'needs a goal, whose exposure it dates');
}

function checkBackgrounds(
  backgrounds: readonly Partial<BackgroundIn>[],
  goal: Partial<GoalIn> | undefined,
  last: unknown,
  issue: (path: (string | number)[], message: string) => void,
): void {
  const names = new Map<unknown, number>();
  backgrounds.forEach((background, j) => {
    if (typeof background !== 'object' || background === null) return;
    const first = names.get(background.name);
    if (first !== undefined && typeof background.name === 'string')
      issue(['backgrounds', j, 'name'], `is the name of background ${first} already`);
    else names.set(background.name, j);
    if (goal?.kind === 'exclusion' && goal.method !== 'likelihood' && Number(background.relativeUncertainty) > 0) {
      issue(
        ['backgrounds', j, 'relativeUncertainty'],
        `must be 0 with the method "${goal.method}"; the method "likelihood" takes uncertain backgrounds`,
      );
    }
    if (background.kind !== 'perBin' || !Array.isArray(background.rates)) return;
    const bins = new Set<number>();
    background.rates.forEach(({ electrons }, i) => {
      if (typeof last === 'number' && electrons > last) {
        issue(['backgrounds', j, 'rates', i, 'electrons'], `is beyond the last bin, maxElectrons = ${last}`);
      }
      if (bins.has(electrons)) issue(['backgrounds', j, 'rates', i, 'electrons'], `names bin ${electrons} again`);
      bins.add(electrons);
    });
  });
}

/** Everything of a scenario but its dark matter and its crystal, which a reach asks for in other forms. */
const sections = {
  halo: Halo.optional(),
  screening: Screening,
  ionization: Ionization.optional(),
  readout: Readout.optional(),
  backgrounds: Backgrounds.optional().meta({ description: 'Everything but the signal that is counted, at most 50.' }),
  goal: Goal.optional(),
};

interface Sections {
  readonly halo?: HaloIn | undefined;
  readonly screening: Screening;
  readonly ionization?: IonizationIn | undefined;
  readonly readout?: ReadoutIn | undefined;
  readonly backgrounds?: readonly BackgroundIn[] | undefined;
  readonly goal?: GoalIn | undefined;
}

/** Defaults filled in; the default window is part of the canonical request. */
function filled({ halo, screening, ionization = DEFAULT_IONIZATION, readout, backgrounds = [], goal }: Sections) {
  return {
    halo: halo ?? DEFAULT_HALO,
    screening,
    ionization,
    readout,
    backgrounds,
    goal: goal && { ...goal, window: goal.window ?? { from: 1, to: ionization.maxElectrons } },
  };
}

/** The fields of a scenario, for requests that add to them. */
export const scenarioShape = {
  darkMatter: DarkMatter,
  crystal: Crystal,
  ...sections,
  payload: Payload.optional(),
  spectrum: z.boolean().default(false).meta({ description: 'Adds dR/dE on the table’s energy axis.' }),
};

interface ScenarioFields extends Sections {
  readonly darkMatter: DarkMatterIn;
  readonly crystal: CrystalIn;
  readonly payload?: readonly PayloadStage[] | undefined;
  readonly spectrum: boolean;
}

export function scenarioOf({ darkMatter, crystal, payload, spectrum, ...rest }: ScenarioFields): ScenarioIn {
  return { darkMatter, crystal, ...filled(rest), payload, spectrum };
}

export const Scenario = z
  .strictObject(scenarioShape)
  .superRefine(checkScenario, { when: () => true })
  .meta({ id: 'Scenario', description: 'A scenario. Without a goal the answer has rates only.' })
  .transform(scenarioOf);

const MOST_TABLES = 8;

/** A scenario whose mass and cross section are what is asked for; several tables in place of one make a band. */
export interface ReachScenarioIn extends Omit<ScenarioIn, 'darkMatter' | 'crystal'> {
  readonly darkMatter: Pick<DarkMatterIn, 'mediator' | 'massSplittingEv'>;
  readonly crystals: readonly CrystalIn[];
}

function checkReachScenario(input: unknown, context: z.RefinementCtx): void {
  checkScenario(input, context);
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  if ((input as { goal?: unknown }).goal === undefined) {
    context.addIssue({ code: 'custom', path: ['goal'], message: 'is needed: it is what the exposure is to achieve' });
  }
}

export const ReachScenario = z
  .strictObject({
    darkMatter: z
      .strictObject({ mediator: MediatorIn, massSplitting: MassSplitting })
      .meta({ id: 'ReachDarkMatter', description: 'The hypothesis but for mass and cross section.' })
      .transform((dm) => ({ mediator: dm.mediator, massSplittingEv: dm.massSplitting })),
    crystal: z
      .union([Crystal, z.array(Crystal).min(1).max(MOST_TABLES)], {
        error: () => 'must be {"id": "…"} of a stored table, a whole table, or a list of them',
      })
      .meta({
        id: 'CrystalOrBand',
        description: 'One table, or a list of them: then the answer has a band, lowest and highest.',
      }),
    ...sections,
  })
  .superRefine(checkReachScenario, { when: () => true })
  .meta({ id: 'ReachScenario', description: 'A scenario without mass and cross section; its goal is needed.' })
  .transform(
    ({ darkMatter, crystal, ...rest }): ReachScenarioIn => ({
      darkMatter,
      crystals: Array.isArray(crystal) ? crystal : [crystal],
      ...filled(rest),
      payload: undefined,
      spectrum: false,
    }),
  );
