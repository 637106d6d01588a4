/**
 * The f-sum rule, a table's own test of its units and its normalisation (Nozières & Pines, Phys. Rev. 113, 1254 (1959); Johnson,
 * Phys. Rev. B 9, 4475 (1974)). With N_e the electrons of a cell that the table describes, at every momentum, screened or not,
 *
 *   ∫ E |f(q, E)|² dE = N_e q⁵/(4 α mₑ³)        equivalently ∫ E Im ε dE = ∫ E Im[−1/ε] dE = π ω_p²/2, ω_p² = 4π α N_e/(mₑ V)
 *
 * A table that ends at energy T has a share of it, which nears 1 where the electrons' response lies below T.
 */
import { ELECTRON_MASS_EV, FINE_STRUCTURE, REFERENCE_MOMENTUM_EV } from '../constants.ts';
import { requirePositive } from '../errors.ts';
import { type CrystalTable, cellVolumePerEv3, columnsOf, formFactorPerResponse, rowsOf } from './crystal-table.ts';
import { rowFifthPowersEv5, rowMomentaEv } from './fifth-power.ts';

export interface SumRule {
  /** Momenta, eV, ascending: the middle of each cell, or each sample above 0. */
  readonly momentumEv: Float64Array;
  /** Share of the f-sum rule at each. */
  readonly share: Float64Array;
  /** Momenta, eV, between which the share should be near 1 if the table describes all that the N_e electrons do. */
  readonly nearOne: { readonly fromEv: number; readonly toEv: number };
}

/**
 * ∫ E g(E) dE of each row of a matrix of a table's shape, in its unit times eV²: exact, constant in cells or linear between points.
 * From column `from` on, as if the numbers before it were 0.
 */
export function energyMoments(table: CrystalTable, values = table.values, from = 0): Float64Array {
  const weights = energyWeights(table);
  const columns = weights.length;
  const moments = new Float64Array(rowsOf(table));
  for (let i = 0; i < moments.length; i++) {
    let sum = 0;
    for (let j = from; j < columns; j++) sum += weights[j] * values[i * columns + j];
    moments[i] = sum;
  }
  return moments;
}

/** Weights w_j with ∫ E g dE = Σ w_j g_j. */
function energyWeights(table: CrystalTable): Float64Array {
  const { energyEv, axes } = table;
  const weights = new Float64Array(columnsOf(table));
  for (let j = 0; j < energyEv.length - 1; j++) {
    const [a, b] = [energyEv[j], energyEv[j + 1]];
    if (axes === 'edges') weights[j] = ((b - a) * (b + a)) / 2;
    else {
      weights[j] += ((b - a) * (2 * a + b)) / 6;
      weights[j + 1] += ((b - a) * (a + 2 * b)) / 6;
    }
  }
  return weights;
}

/**
 * Upper end, eV, of the momenta at which electrons respond below energy T: the Bethe ridge with its Doppler width,
 * q²/2mₑ + q p_F/mₑ = T, p_F = (3π² N_e/V)^{1/3} the Fermi momentum of as many free electrons (α mₑ, the atomic scale, where the
 * volume is not known).
 */
export function nearOneTo(table: CrystalTable, electronsPerCell: number, topEv: number): number {
  const density = electronsPerCell / cellVolumePerEv3(table);
  const p = density > 0 ? Math.cbrt(3 * Math.PI ** 2 * density) : REFERENCE_MOMENTUM_EV;
  return (2 * ELECTRON_MASS_EV * topEv) / (p + Math.sqrt(p * p + 2 * ELECTRON_MASS_EV * topEv));
}

/**
 * The share at every momentum above 0. Exact for the table as defined: cell means are compared with the cell mean of q⁵, samples
 * with q⁵ itself, and a loss function (or Im ε) with π ω_p²/2.
 *
 * Accuracy: rounding (test/physics/crystal/sum-rule.test.ts: free-electron ridge, undamped plasmon).
 *
 * @throws DomainError unless electronsPerCell is finite and above 0
 * @example sumRule(silicon, 8).share // 0.96 at q = 0.5 α mₑ, below 50 eV
 */
export function sumRule(table: CrystalTable, electronsPerCell: number): SumRule {
  requirePositive('electronsPerCell', electronsPerCell);
  const full = electronsPerCell / (4 * FINE_STRUCTURE * ELECTRON_MASS_EV ** 3);
  const moments = energyMoments(table);
  const momenta = rowMomentaEv(table);
  const powers = rowFifthPowersEv5(table);
  const perPower = table.quantity === 'formFactorSquared' ? undefined : formFactorPerResponse(table);
  const rows = Array.from(momenta.keys()).filter((i) => momenta[i] > 0);
  return {
    momentumEv: Float64Array.from(rows, (i) => momenta[i]),
    share: Float64Array.from(rows, (i) => (moments[i] * (perPower ?? 1 / powers[i])) / full),
    nearOne: {
      fromEv: table.momentumEv[0],
      toEv: nearOneTo(table, electronsPerCell, table.energyEv[table.energyEv.length - 1]),
    },
  };
}

/** π ω_p²/2, eV²: what ∫ E Im ε dE and ∫ E Im[−1/ε] dE come to for N_e electrons in each volume V (eV⁻³). */
export function fullResponseEv2(electronsPerCell: number, volumePerEv3: number): number {
  return (2 * Math.PI ** 2 * FINE_STRUCTURE * electronsPerCell) / (ELECTRON_MASS_EV * volumePerEv3);
}
