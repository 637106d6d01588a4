import { DomainError } from '../errors.ts';

/** Refuses anything but a number strictly between 0 and 1 (NaN included). */
export function requireProbability(parameter: string, value: number): void {
  if (!(value > 0 && value < 1)) throw new DomainError(parameter, value, 'above 0 and below 1');
}
