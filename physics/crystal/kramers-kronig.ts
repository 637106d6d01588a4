/**
 * The Kramers–Kronig integral (Kramers, Atti Congr. Int. Fisici Como 2, 545 (1927); Landau & Lifshitz, Electrodynamics of
 * Continuous Media, § 82)
 *
 *   K(E) = (2/π) P∫ E′ g(E′)/(E′² − E²) dE′        Re ε = 1 + K[Im ε],   Re[1/ε] = 1 − K[Im(−1/ε)]
 *
 * g is constant in cells or linear between points, and then every piece is a logarithm: no quadrature, no pole to step over.
 *
 *   constant on [a, b]   (g/π) ln |(b² − E²)/(a² − E²)|
 *   linear on [a, b]     (1/π) [g(E) ln |(b − E)/(a − E)| + g(−E) ln ((b + E)/(a + E)) + 2 (g_b − g_a)]
 *
 * with g(±E) on the line's continuation. At a point two pieces meet and the logarithms of zero cancel.
 */
import type { AxisKind } from './crystal-table.ts';

/**
 * K at the energies that stand for the columns: the middles of cells, or the points. `values` is row-major, `rows` times the
 * columns the axis makes; the result has the same shape. Costs rows × columns² multiplications and columns² logarithms.
 *
 * Edge behaviour: at the first or last point, a value other than 0 is a step there, where the exact K is infinite; its logarithm
 * is left out. Accuracy: rounding, 1e-12, for the staircase or polygon that the values are; for a smooth g that they sample, first
 * order in the width of cells, second order in that of points (test/physics/crystal/kramers-kronig.test.ts).
 */
export function kramersKronig(
  axes: AxisKind,
  energyEv: Float64Array,
  values: Float64Array,
  rows: number,
): Float64Array {
  const columns = axes === 'edges' ? energyEv.length - 1 : energyEv.length;
  const result = new Float64Array(rows * columns);
  const kernel = new Float64Array(columns);
  for (let j = 0; j < columns; j++) {
    const e = axes === 'edges' ? (energyEv[j] + energyEv[j + 1]) / 2 : energyEv[j];
    fillKernel(axes, energyEv, e, kernel);
    for (let i = 0; i < rows; i++) {
      const row = i * columns;
      let sum = 0;
      for (let k = 0; k < columns; k++) sum += kernel[k] * values[row + k];
      result[row + j] = sum;
    }
  }
  return result;
}

/** K at E = 0, (2/π) ∫ g/E dE, of each row. A value other than 0 at E = 0 makes it infinite: that piece is left out. */
export function staticKramersKronig(
  axes: AxisKind,
  energyEv: Float64Array,
  values: Float64Array,
  rows: number,
): Float64Array {
  const columns = axes === 'edges' ? energyEv.length - 1 : energyEv.length;
  const kernel = new Float64Array(columns);
  fillKernel(axes, energyEv, 0, kernel);
  if (energyEv[0] === 0) kernel[0] = 0;
  return Float64Array.from({ length: rows }, (_, i) =>
    kernel.reduce((sum, weight, k) => sum + weight * values[i * columns + k], 0),
  );
}

/** Weights k_j with K(E) = Σ k_j g_j. */
function fillKernel(axes: AxisKind, energyEv: Float64Array, e: number, kernel: Float64Array): void {
  kernel.fill(0);
  let [minus, plus] = [logarithm(energyEv[0] - e), logarithm(energyEv[0] + e)];
  for (let j = 0; j < energyEv.length - 1; j++) {
    const [a, b] = [energyEv[j], energyEv[j + 1]];
    const [nextMinus, nextPlus] = [logarithm(b - e), logarithm(b + e)];
    const [near, far] = [(nextMinus - minus) / Math.PI, (nextPlus - plus) / Math.PI];
    [minus, plus] = [nextMinus, nextPlus];
    if (axes === 'edges') kernel[j] = near + far;
    else {
      const [t, s] = [(e - a) / (b - a), (-e - a) / (b - a)];
      kernel[j] += near * (1 - t) + far * (1 - s) - 2 / Math.PI;
      kernel[j + 1] += near * t + far * s + 2 / Math.PI;
    }
  }
}

/** ln |x|, and 0 for the zeros that cancel between two pieces. */
function logarithm(x: number): number {
  return x === 0 ? 0 : Math.log(Math.abs(x));
}
