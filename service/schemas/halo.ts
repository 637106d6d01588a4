/** The dark-matter halo as the laboratory meets it. */
import { z } from 'zod';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../physics/constants.ts';
import { DomainError } from '../../physics/errors.ts';
import { largestSpeedOfComponentsKmPerS } from '../../physics/halo/components.ts';
import { laboratoryVelocity, PECULIAR_VELOCITY_KM_PER_S } from '../../physics/halo/earth-velocity.ts';
import { type GalacticVelocity, speedOf } from '../../physics/halo/galactic-velocity.ts';
import {
  tabulatedGalacticHalo,
  tabulatedLaboratoryHalo,
  tabulatedMeanInverseSpeed,
} from '../../physics/halo/tabulated.ts';
import { instant } from './detector.ts';
import { Velocity } from './galactic-velocity.ts';
import { type ComponentIn, Components, Tabulated, type TabulatedIn } from './halo-model.ts';
import { ABOVE_ZERO, KINDS, quantity, SPEED_ABOVE_ZERO, SPEED_AT_LEAST_ZERO } from './quantity.ts';

/** The laboratory's way through a halo that stands still in the galaxy. Keys that are not used are absent: they are hashed. */
export interface MovingLaboratory {
  readonly localDensityGevPerCm3: number;
  readonly circularSpeedKmPerS: number;
  readonly laboratorySpeedKmPerS: number;
  /** Where more than its length is known or needed. */
  readonly laboratoryVelocityKmPerS?: GalacticVelocity;
  /** The Sun's, where it was given. */
  readonly peculiarVelocityKmPerS?: GalacticVelocity;
}

export interface StandardHaloIn extends MovingLaboratory {
  readonly model?: undefined;
  readonly escapeSpeedKmPerS: number;
  readonly cutoff: 'sharp' | 'smooth';
}

export interface ComponentsHaloIn extends MovingLaboratory {
  readonly model: 'components';
  readonly laboratoryVelocityKmPerS: GalacticVelocity;
  readonly components: readonly (ComponentIn & { readonly escapeSpeedKmPerS: number })[];
}

export interface GalacticTableHaloIn extends MovingLaboratory, TabulatedIn {
  readonly model: 'tabulated';
  readonly kind: 'galactic';
}

export interface LaboratoryTableHaloIn extends TabulatedIn {
  readonly localDensityGevPerCm3: number;
  readonly model: 'tabulated';
  readonly kind: 'laboratory' | 'meanInverseSpeed';
}

export type MovingHaloIn = StandardHaloIn | ComponentsHaloIn | GalacticTableHaloIn;
export type HaloIn = MovingHaloIn | LaboratoryTableHaloIn;

/** Whether the halo stands in the galaxy, so that the laboratory moves through it and dates matter. */
export function isMoving(halo: HaloIn): halo is MovingHaloIn {
  return halo.model !== 'tabulated' || halo.kind === 'galactic';
}

interface Given {
  readonly localDensity?: number | undefined;
  readonly circularSpeed?: number | undefined;
  readonly escapeSpeed?: number | undefined;
  readonly laboratorySpeed?: number | undefined;
  readonly date?: string | undefined;
  readonly peculiarVelocity?: GalacticVelocity | undefined;
  readonly cutoff?: 'sharp' | 'smooth' | undefined;
  readonly model?: 'standard' | 'components' | 'tabulated' | undefined;
  readonly components?: readonly ComponentIn[] | undefined;
  readonly tabulated?: TabulatedIn | undefined;
}

/** Defaults: Baxter et al., Eur. Phys. J. C 81, 907 (2021); 250 km/s stands for the Sun's own speed. */
const DEFAULTS = {
  localDensity: 0.3,
  circularSpeed: 238,
  escapeSpeed: 544,
  laboratorySpeed: 250,
} as const;
export const DEFAULT_LABORATORY_SPEED_KM_PER_S = DEFAULTS.laboratorySpeed;

/** Faults between fields; runs on whatever could be read. */
function checkHalo(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const given = input as Given;
  const { model = 'standard' } = given;
  const issue = (path: string[], message: string): void => context.addIssue({ code: 'custom', path, message });
  if (given.date !== undefined && given.laboratorySpeed !== undefined)
    issue([], 'takes "date" or "laboratorySpeed", not both: a date sets the speed');
  const outside = (field: keyof Given, why: string): void => {
    if (given[field] !== undefined) issue([field], why);
  };
  for (const of of ['components', 'tabulated'] as const) {
    if (model === of && given[of] === undefined) issue([of], `is needed by the model "${of}"`);
    if (model !== of) outside(of, `belongs to the model "${of}"`);
  }
  if (model !== 'standard') outside('cutoff', 'belongs to the model "standard"');
  if (model !== 'tabulated') return;
  outside('escapeSpeed', 'is where the table ends');
  const kind = given.tabulated?.kind;
  if (kind !== 'laboratory' && kind !== 'meanInverseSpeed') return;
  for (const field of ['circularSpeed', 'laboratorySpeed', 'date', 'peculiarVelocity'] as const)
    outside(field, 'has no meaning for a table in the laboratory’s frame');
}

/** The laboratory's velocity along the Sun's, at a given speed, km/s. */
export function velocityAlongSun(
  speedKmPerS: number,
  circularSpeedKmPerS: number,
  peculiarKmPerS: GalacticVelocity = PECULIAR_VELOCITY_KM_PER_S,
): GalacticVelocity {
  const sun = laboratoryVelocity(circularSpeedKmPerS, peculiarKmPerS);
  const length = speedOf(sun);
  if (length === 0) return [0, speedKmPerS, 0];
  const share = speedKmPerS / length;
  return [share * sun[0], share * sun[1], share * sun[2]];
}

function movingLaboratory(given: Given): MovingLaboratory {
  const {
    localDensity = DEFAULTS.localDensity,
    circularSpeed = DEFAULTS.circularSpeed,
    laboratorySpeed,
    date,
    peculiarVelocity,
    model,
  } = given;
  const common = {
    localDensityGevPerCm3: localDensity,
    circularSpeedKmPerS: circularSpeed,
    ...(peculiarVelocity ? { peculiarVelocityKmPerS: peculiarVelocity } : {}),
  };
  if (date !== undefined || (peculiarVelocity && laboratorySpeed === undefined)) {
    const velocity = laboratoryVelocity(circularSpeed, peculiarVelocity, date === undefined ? date : Date.parse(date));
    return { ...common, laboratorySpeedKmPerS: speedOf(velocity), laboratoryVelocityKmPerS: velocity };
  }
  const speed = laboratorySpeed ?? DEFAULTS.laboratorySpeed;
  const needsVelocity = peculiarVelocity !== undefined || model === 'components';
  return {
    ...common,
    laboratorySpeedKmPerS: speed,
    ...(needsVelocity ? { laboratoryVelocityKmPerS: velocityAlongSun(speed, circularSpeed, peculiarVelocity) } : {}),
  };
}

/** The halo as it is computed with. @throws DomainError where the model refuses it */
function resolved(given: Given): HaloIn {
  const { model, components = [], tabulated, escapeSpeed = DEFAULTS.escapeSpeed, cutoff = 'sharp' } = given;
  if (model === 'tabulated' && tabulated) {
    const { localDensity = DEFAULTS.localDensity } = given;
    const { kind } = tabulated;
    if (kind !== 'galactic') {
      (kind === 'laboratory' ? tabulatedLaboratoryHalo : tabulatedMeanInverseSpeed)(tabulated);
      return { localDensityGevPerCm3: localDensity, model, ...tabulated, kind };
    }
    const moving = movingLaboratory(given);
    requireBelowLight('tabulated', tabulatedGalacticHalo(tabulated, moving.laboratorySpeedKmPerS).largestSpeedKmPerS);
    return { ...moving, model, ...tabulated, kind };
  }
  const { localDensityGevPerCm3, circularSpeedKmPerS, laboratorySpeedKmPerS, ...velocities } = movingLaboratory(given);
  if (model !== 'components')
    return {
      localDensityGevPerCm3,
      circularSpeedKmPerS,
      escapeSpeedKmPerS: escapeSpeed,
      laboratorySpeedKmPerS,
      cutoff,
      ...velocities,
    };
  const cut = components.map((component) => ({
    ...component,
    escapeSpeedKmPerS: component.escapeSpeedKmPerS ?? escapeSpeed,
  }));
  const laboratoryVelocityKmPerS = velocities.laboratoryVelocityKmPerS!;
  requireBelowLight('components', largestSpeedOfComponentsKmPerS(cut, laboratoryVelocityKmPerS));
  return {
    localDensityGevPerCm3,
    circularSpeedKmPerS,
    laboratorySpeedKmPerS,
    ...velocities,
    laboratoryVelocityKmPerS,
    model,
    components: cut,
  };
}

function requireBelowLight(parameter: string, largestSpeedKmPerS: number): void {
  if (!(largestSpeedKmPerS < SPEED_OF_LIGHT_KM_PER_S))
    throw new DomainError(parameter, largestSpeedKmPerS, 'below the speed of light in the laboratory');
}

/** Where a parameter of the calculation stands in the halo. */
function pathOf([first, ...rest]: readonly (string | number)[], given: Given): (string | number)[] {
  if (first === 'speeds') return ['tabulated', 'speeds', ...(rest.length > 0 ? ['values', ...rest] : [])];
  if (first === 'values') return ['tabulated', 'values', ...rest];
  if (first === 'laboratorySpeed' && given.laboratorySpeed === undefined)
    return given.peculiarVelocity ? ['peculiarVelocity'] : ['circularSpeed'];
  return [first, ...rest];
}

export const Halo = z
  .strictObject({
    localDensity: quantity(
      'LocalDensity',
      KINDS.density,
      ABOVE_ZERO,
      'Local density ρ of dark matter; default 0.3 GeV/cm^3.',
    ).optional(),
    circularSpeed: quantity(
      'CircularSpeed',
      KINDS.speed,
      SPEED_ABOVE_ZERO,
      'Circular speed v₀, default 238 km/s; it is also the Sun’s rotation.',
    ).optional(),
    escapeSpeed: quantity(
      'EscapeSpeed',
      KINDS.speed,
      SPEED_ABOVE_ZERO,
      'Escape speed v_esc, default 544 km/s.',
    ).optional(),
    laboratorySpeed: quantity(
      'LaboratorySpeed',
      KINDS.speed,
      SPEED_AT_LEAST_ZERO,
      'Speed v_E of the laboratory through the halo, default 250 km/s; its direction is taken as the Sun’s.',
    ).optional(),
    date: instant.optional().meta({
      description:
        'In place of laboratorySpeed: the speed on this date, |(0, v₀, 0) + peculiar + Earth’s|. 1950 to 2100; without time, 00:00 UTC.',
    }),
    peculiarVelocity: Velocity.optional().meta({
      description:
        'The Sun’s with respect to the local standard of rest; default (11.1, 12.2, 7.3) km/s. With neither date nor laboratorySpeed the ' +
        'laboratory’s velocity is then the Sun’s.',
    }),
    cutoff: z.enum(['sharp', 'smooth']).optional().meta({
      description: 'sharp (default): f ∝ exp(−v²/v₀²) below v_esc; smooth: f ∝ exp(−v²/v₀²) − exp(−v_esc²/v₀²).',
    }),
    model: z.enum(['standard', 'components', 'tabulated']).optional().meta({
      description: 'standard (default): a Maxwellian; components: a sum of Gaussians; tabulated: as given.',
    }),
    components: Components.optional().meta({ description: 'For the model components; at most 20.' }),
    tabulated: Tabulated.optional().meta({ description: 'For the model tabulated.' }),
  })
  .superRefine(checkHalo, { when: () => true })
  .meta({
    id: 'Halo',
    description:
      'Standard Halo Model by default; every field optional. Defaults: 0.3 GeV/cm^3, 238, 544 and 250 km/s, sharp.',
  })
  .transform((given, context): HaloIn => {
    try {
      return resolved(given);
    } catch (error) {
      if (!(error instanceof DomainError)) throw error;
      context.addIssue({ code: 'custom', path: pathOf(error.parameter, given), message: `must be ${error.allowed}` });
      return z.NEVER;
    }
  });

/** What stands where a request has no halo. */
export const DEFAULT_HALO: HaloIn = Halo.parse({});
