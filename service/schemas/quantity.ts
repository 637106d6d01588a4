/** Quantities as they come in (with any compatible unit) and as they go out (in their fixed unit). */
import { z } from 'zod';
import type { QuantityKind } from '../../physics/quantity/quantity.ts';
import { KINDS, parseQuantity, QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';

export interface Domain {
  readonly test: (value: number) => boolean;
  readonly text: string;
}

export const ABOVE_ZERO: Domain = { test: (value) => value > 0, text: 'above 0' };
export const AT_LEAST_ZERO: Domain = { test: (value) => value >= 0, text: 'at least 0' };
export const ANY_SIGN: Domain = { test: () => true, text: 'a finite number' };
const LIGHT_KM_PER_S = 299_792.458;
export const SPEED_ABOVE_ZERO: Domain = {
  test: (value) => value > 0 && value < LIGHT_KM_PER_S,
  text: 'above 0 and below the speed of light',
};
export const SPEED_AT_LEAST_ZERO: Domain = {
  test: (value) => value >= 0 && value < LIGHT_KM_PER_S,
  text: 'at least 0 and below the speed of light',
};

/** A quantity in, turned into a number of the kind's fixed unit. `id` names it in the OpenAPI document. */
export function quantity(id: string, of: QuantityKind, domain: Domain, description: string) {
  const form = `must be ${of.name} with its unit, such as "${of.example}"`;
  return z
    .union(
      [
        z.string().meta({ maxLength: 64, examples: [of.example] }),
        z.strictObject({ value: z.number(), unit: z.string().meta({ maxLength: 64, examples: [of.unit] }) }),
      ],
      { error: () => form },
    )
    .meta({ id, description: `${description} In: ${of.name} in any compatible unit, ${domain.text}.` })
    .transform((input, context): number => {
      try {
        const value = typeof input === 'string' ? parseQuantity(input, of) : quantityOf(input.value, input.unit, of);
        if (domain.test(value)) return value;
        context.addIssue({ code: 'custom', message: `must be ${domain.text}; got ${value} ${of.unit}` });
      } catch (error) {
        if (!(error instanceof QuantityError)) throw error;
        context.addIssue({ code: 'custom', message: error.message });
      }
      return z.NEVER;
    });
}

export { KINDS };

/** Schema of a quantity out. */
export function quantityOut<U extends string>(unit: U) {
  return z.strictObject({ value: z.number(), unit: z.literal(unit) });
}

/** Schema of a quantity out that was integrated numerically. */
export function estimateOut<U extends string>(unit: U) {
  return z.strictObject({
    value: z.number(),
    unit: z.literal(unit),
    relativeError: z
      .number()
      .min(0)
      .meta({ description: 'Estimated error of the integration, relative; 0 for an exact zero.' }),
  });
}

/** Schema of an array of numbers with one unit. */
export function quantitiesOut<U extends string>(unit: U) {
  return z.strictObject({ unit: z.literal(unit), values: z.array(z.number()) });
}
