import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { bracketedRoot } from '../../../physics/numeric/bracketed-root.ts';

describe('bracketedRoot', () => {
  it.each([
    { name: 'x² − 2', f: (x: number) => x * x - 2, a: 0, b: 2, root: Math.SQRT2 },
    { name: 'cos x − x', f: (x: number) => Math.cos(x) - x, a: 0, b: 1, root: 0.7390851332151607 },
    { name: 'x⁹', f: (x: number) => x ** 9, a: -1, b: 1.3, root: 0 },
    { name: 'a step at 0.3', f: (x: number) => (x < 0.3 ? -1 : 2), a: 0, b: 1, root: 0.3 },
    { name: 'reversed ends', f: (x: number) => 1 - x, a: 5, b: -5, root: 1 },
  ])('finds the root of $name within the error it states', ({ f, a, b, root }) => {
    const found = bracketedRoot(f, a, b, 1e-10);
    expect(Math.abs(found.root - root)).toBeLessThanOrEqual(found.error + 1e-15);
    expect(found.error).toBeLessThanOrEqual(1.1e-10);
  });

  it('takes few evaluations where f is smooth', () => {
    expect(bracketedRoot((x) => Math.exp(x) - 5, 0, 4, 1e-12).evaluations).toBeLessThan(14);
  });

  it('refuses ends of one sign, and NaN', () => {
    expect(() => bracketedRoot((x) => x * x + 1, -1, 1, 1e-6)).toThrow(DomainError);
    expect(() => bracketedRoot(() => Number.NaN, -1, 1, 1e-6)).toThrow(DomainError);
  });
});
