/** Tables for which the rate is known in closed form. Numbers of formulas, for tests alone. */
import {
  ELECTRON_MASS_EV,
  FINE_STRUCTURE,
  REFERENCE_MOMENTUM_EV,
  SPEED_OF_LIGHT_KM_PER_S,
} from '../../physics/constants.ts';
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';

/**
 * Eight free electrons at rest: |f|² = N q³ δ(E − q²/2mₑ)/(2 α mₑ²) as cell means. The energy edges are those of the momentum
 * edges, so the ridge runs through the diagonal cells from corner to corner.
 */
export function ridgeTable(massEv: number, largestSpeedKmPerS: number, cells: number): CrystalTable {
  const reduced = (massEv * ELECTRON_MASS_EV) / (massEv + ELECTRON_MASS_EV);
  const largest = (2.02 * reduced * largestSpeedKmPerS) / SPEED_OF_LIGHT_KM_PER_S;
  const momentumEv = Float64Array.from({ length: cells + 1 }, (_, i) => (largest * (i + 1)) / (cells + 1));
  const energyEv = momentumEv.map((q) => (q * q) / (2 * ELECTRON_MASS_EV));
  const values = new Float64Array(cells * cells);
  for (let i = 0; i < cells; i++) {
    const area = (momentumEv[i + 1] - momentumEv[i]) * (energyEv[i + 1] - energyEv[i]);
    values[i * cells + i] =
      ((8 / (2 * FINE_STRUCTURE * ELECTRON_MASS_EV ** 2)) * (momentumEv[i + 1] ** 4 - momentumEv[i] ** 4)) / 4 / area;
  }
  return { axes: 'edges', quantity: 'formFactorSquared', momentumEv, energyEv, values, cellMassEv: 52.32e9 };
}

/** |f|² = K q² with K = 1e-8 eV⁻², times (q/α mₑ)⁴ for the light mediator: exact cell means on a logarithmic axis. */
export function gaussianTable(mediator: 'heavy' | 'light', rows: number): CrystalTable {
  const momentumEv = Float64Array.from({ length: rows + 1 }, (_, i) => 50 * 20_000 ** (i / rows));
  const energyEv = Float64Array.from([0.5, 3, 7, 11, 15]);
  const power = mediator === 'heavy' ? 2 : 6;
  const scale = mediator === 'heavy' ? 1e-8 : 1e-8 / REFERENCE_MOMENTUM_EV ** 4;
  const values = new Float64Array(rows * 4);
  for (let i = 0; i < rows; i++) {
    const [a, b] = [momentumEv[i], momentumEv[i + 1]];
    values.fill((scale * (b ** (power + 1) - a ** (power + 1))) / ((power + 1) * (b - a)), 4 * i, 4 * i + 4);
  }
  return { axes: 'edges', quantity: 'formFactorSquared', momentumEv, energyEv, values, cellMassEv: 52.32e9 };
}
