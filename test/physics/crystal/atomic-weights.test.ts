import { describe, expect, it } from 'vitest';
import { cellMassOfFormulaGev } from '../../../physics/crystal/atomic-weights.ts';

describe('cellMassOfFormulaGev', () => {
  it.each([
    ['Si2', 52.32], // two silicon atoms, as the project's physics notes give it
    ['Ge2', 135.31], // 2 × 72.63 u
    ['C2', 22.376],
    ['GaAs', 134.736],
    ['Al2O3', 94.98], // 101.96 u
  ])('%s weighs %d GeV', (formula, gev) => {
    expect(Math.abs(cellMassOfFormulaGev(formula) / gev - 1)).toBeLessThan(1e-4);
  });

  it.each(['', 'si', 'Xx2', 'Si0', 'Si2)', 'Tc', '2Si', 'Si-2'])('refuses "%s"', (formula) => {
    expect(() => cellMassOfFormulaGev(formula)).toThrow(RangeError);
  });
});
