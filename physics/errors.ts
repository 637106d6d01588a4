/**
 * Errors of the calculation carry facts; the sentence a caller reads is built in the service, in one place.
 */

/** A parameter outside its domain. `parameter` is a path of field names (`['halo', 'escapeSpeed']`) relative to what was called. */
export class DomainError extends Error {
  readonly parameter: readonly (string | number)[];
  readonly value: unknown;
  readonly allowed: string;

  constructor(parameter: string | readonly (string | number)[], value: unknown, allowed: string) {
    const path = typeof parameter === 'string' ? [parameter] : parameter;
    super(`${path.join('.')} = ${String(value)}: ${allowed}`);
    this.name = 'DomainError';
    this.parameter = path;
    this.value = value;
    this.allowed = allowed;
  }
}

/** Refuses anything but a finite number above zero (NaN included). */
export function requirePositive(parameter: string, value: number): void {
  if (!(value > 0 && value < Infinity)) throw new DomainError(parameter, value, 'a finite number above 0');
}

/** Refuses anything but a finite number of at least zero (NaN included). */
export function requireNonNegative(parameter: string, value: number): void {
  if (!(value >= 0 && value < Infinity)) throw new DomainError(parameter, value, 'a finite number of at least 0');
}
