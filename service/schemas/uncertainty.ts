/** Uncertain parameters of a scenario, and what they do to its rates and exposure. */
import { z } from 'zod';
import { DomainError } from '../../physics/errors.ts';
import { QuantityError, type QuantityKind, quantityOf } from '../../physics/quantity/quantity.ts';
import { cholesky } from '../../physics/uncertainty/cholesky.ts';
import { type HaloIn, isMoving } from './halo.ts';
import type { IonizationIn } from './ionization.ts';
import { ABOVE_ZERO, KINDS, quantitiesOut, quantity } from './quantity.ts';

/** In the order in which they are drawn. */
const PARAMETERS = [
  'circularSpeed',
  'escapeSpeed',
  'localDensity',
  'laboratorySpeed',
  'energyPerPair',
  'bandGap',
] as const;
export type ParameterName = (typeof PARAMETERS)[number];

const KIND_OF: Readonly<Record<ParameterName, QuantityKind>> = {
  circularSpeed: KINDS.speed,
  escapeSpeed: KINDS.speed,
  localDensity: KINDS.density,
  laboratorySpeed: KINDS.speed,
  energyPerPair: KINDS.energy,
  bandGap: KINDS.energy,
};

const MOST_DRAWS = 10_000;

export interface UncertaintyIn {
  readonly draws: number;
  readonly seed: number;
  readonly parameters: readonly ParameterName[];
  /** In the fixed units: km/s, GeV/cm^3, eV. */
  readonly spread:
    | { readonly standardDeviations: readonly number[] }
    | { readonly covariance: readonly (readonly number[])[] };
}

const deviation = (name: ParameterName) =>
  quantity(
    `${name[0].toUpperCase()}${name.slice(1)}Deviation`,
    KIND_OF[name],
    ABOVE_ZERO,
    'One standard deviation.',
  ).optional();

const Deviations = z
  .strictObject({
    circularSpeed: deviation('circularSpeed'),
    escapeSpeed: deviation('escapeSpeed'),
    localDensity: deviation('localDensity'),
    laboratorySpeed: deviation('laboratorySpeed'),
    energyPerPair: deviation('energyPerPair'),
    bandGap: deviation('bandGap'),
  })
  .meta({ id: 'StandardDeviations', description: 'Of independent parameters, about the scenario’s values.' });

const Covariance = z
  .strictObject({
    parameters: z.array(z.enum(PARAMETERS)).min(1).max(PARAMETERS.length),
    units: z
      .array(z.string().max(64))
      .min(1)
      .max(PARAMETERS.length)
      .meta({ examples: [['km/s', 'GeV/cm^3']] }),
    values: z.array(z.array(z.number()).max(PARAMETERS.length)).min(1).max(PARAMETERS.length).meta({
      description: 'Symmetric, positive definite; element i, j in units i × j.',
    }),
  })
  .meta({ id: 'Covariance', description: 'Of the parameters, in their order, about the scenario’s values.' })
  .transform(({ parameters, units, values }, context) => {
    const issue = (path: (string | number)[], message: string): void =>
      context.addIssue({ code: 'custom', path, message });
    parameters.forEach((name, i) => {
      if (parameters.indexOf(name) < i) issue(['parameters', i], `names "${name}" again`);
    });
    if (units.length !== parameters.length) issue(['units'], `must be one for each parameter, ${parameters.length}`);
    const factors = units.map((unit, i): number => {
      try {
        return i < parameters.length ? quantityOf(1, unit, KIND_OF[parameters[i]]) : 1;
      } catch (error) {
        if (!(error instanceof QuantityError)) throw error;
        issue(['units', i], error.message);
        return 1;
      }
    });
    const covariance = values.map((row, i) => row.map((value, j) => value * factors[i] * factors[j]));
    if (values.length !== parameters.length)
      issue(['values'], `must have a row for each parameter, ${parameters.length}`);
    else if (units.length === parameters.length) refuseIndefinite(covariance, issue);
    return { parameters, covariance };
  });

function refuseIndefinite(
  covariance: readonly (readonly number[])[],
  issue: (path: (string | number)[], message: string) => void,
): void {
  try {
    cholesky(covariance, 'values');
  } catch (error) {
    if (!(error instanceof DomainError)) throw error;
    issue(['values'], `must be ${error.allowed}`);
  }
}

export const Uncertainty = z
  .strictObject({
    draws: z.int().min(1).max(MOST_DRAWS).default(1000),
    seed: z.int().min(0).default(0).meta({ description: 'The same seed gives the same draws.' }),
    parameters: Deviations.optional(),
    covariance: Covariance.optional(),
  })
  .meta({
    id: 'Uncertainty',
    description:
      'Gaussian draws about the scenario’s values; unphysical ones are redrawn and counted. Either parameters or covariance. A drawn ' +
      'circularSpeed moves the laboratory with it.',
  })
  .transform(({ draws, seed, parameters, covariance }, context): UncertaintyIn => {
    const issue = (path: string[], message: string): void => context.addIssue({ code: 'custom', path, message });
    if ((parameters === undefined) === (covariance === undefined))
      issue([], 'takes "parameters" or "covariance", one of them');
    if (covariance)
      return { draws, seed, parameters: covariance.parameters, spread: { covariance: covariance.covariance } };
    const names = PARAMETERS.filter((name) => parameters?.[name] !== undefined);
    if (parameters && names.length === 0) issue(['parameters'], 'must name at least one parameter');
    return { draws, seed, parameters: names, spread: { standardDeviations: names.map((name) => parameters![name]!) } };
  });

/** Why a parameter has no meaning in a scenario; undefined where it has one. */
export function whyNotDrawn(name: ParameterName, halo: HaloIn, ionization: IonizationIn): string | undefined {
  switch (name) {
    case 'localDensity':
      return undefined;
    case 'escapeSpeed':
      return halo.model === undefined ? undefined : 'belongs to the halo model "standard"';
    case 'circularSpeed':
    case 'laboratorySpeed':
      return isMoving(halo) ? undefined : 'has no meaning for a table in the laboratory’s frame';
    case 'bandGap':
    case 'energyPerPair':
      return ionization.model === 'table' ? 'has no part in the ionization model "table"' : undefined;
  }
}

const share = z.number().optional();

const VarianceShares = z
  .strictObject({
    circularSpeed: share,
    escapeSpeed: share,
    localDensity: share,
    laboratorySpeed: share,
    energyPerPair: share,
    bandGap: share,
    unexplained: z.number().meta({ description: 'Interactions and steep curvature.' }),
  })
  .nullable()
  .meta({
    id: 'VarianceShares',
    description:
      'Each parameter’s share of the variance, from a fit of parabolas to the draws; error about 1/√draws. null with too few draws, or ' +
      'where some need an infinite exposure.',
  });

export const UncertaintyOut = z
  .strictObject({
    draws: z.int(),
    seed: z.int(),
    redrawn: z.int().meta({ description: 'Unphysical draws that were drawn anew.' }),
    quantiles: z.array(z.number()).meta({ description: 'Shares of the draws below the values, in their order.' }),
    bins: z.array(
      z.strictObject({ electrons: z.int(), rate: quantitiesOut('1/(kg yr)'), varianceShares: VarianceShares }),
    ),
    total: z.strictObject({ rate: quantitiesOut('1/(kg yr)'), varianceShares: VarianceShares }),
    exposure: z
      .strictObject({
        needed: z.strictObject({ unit: z.literal('kg yr'), values: z.array(z.number().nullable()) }).meta({
          description: 'null where no exposure reaches the goal.',
        }),
        unreached: z.int().meta({ description: 'Draws for which none does.' }),
        varianceShares: VarianceShares,
      })
      .optional()
      .meta({ description: 'With a goal.' }),
  })
  .meta({ id: 'UncertaintyAnswer', description: 'Quantiles over the draws.' });
export type UncertaintyOut = z.output<typeof UncertaintyOut>;
