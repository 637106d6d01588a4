/** Errors as cloneable facts, and back. */
import { DomainError } from '../../physics/errors.ts';
import { DamagedTableError } from '../crystals/crystal-record.ts';
import { type Fault, type NamedCrystal, Problem, type ProblemType } from '../problem.ts';

export type Failure =
  | {
      readonly kind: 'problem';
      readonly type: ProblemType;
      readonly detail: string;
      readonly faults: readonly Fault[];
      readonly namedCrystals: readonly NamedCrystal[];
      readonly faultCount: number;
    }
  | {
      readonly kind: 'domain';
      readonly parameter: readonly (string | number)[];
      readonly value: unknown;
      readonly allowed: string;
    }
  | { readonly kind: 'damaged'; readonly message: string }
  | {
      readonly kind: 'other';
      readonly message: string;
      readonly code: string | undefined;
      readonly stack: string | undefined;
    };

export function failureOf(error: unknown): Failure {
  if (error instanceof Problem) {
    const { type, message: detail, faults, namedCrystals, faultCount } = error;
    return { kind: 'problem', type, detail, faults, namedCrystals, faultCount };
  }
  if (error instanceof DomainError)
    return { kind: 'domain', parameter: error.parameter, value: String(error.value), allowed: error.allowed };
  if (error instanceof DamagedTableError) return { kind: 'damaged', message: error.message };
  const { message, code, stack } = error as NodeJS.ErrnoException;
  return { kind: 'other', message: message ?? String(error), code, stack };
}

export function errorOf(failure: Failure): Error {
  switch (failure.kind) {
    case 'problem':
      return Object.assign(new Problem(failure.type, failure.detail, failure.faults), {
        namedCrystals: failure.namedCrystals,
        faultCount: failure.faultCount,
      });
    case 'domain':
      return new DomainError(failure.parameter, failure.value, failure.allowed);
    case 'damaged':
      return new DamagedTableError(failure.message);
    case 'other':
      return Object.assign(new Error(failure.message), { code: failure.code, stack: failure.stack });
  }
}
