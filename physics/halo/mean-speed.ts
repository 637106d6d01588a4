/** The mean speed in the laboratory, from the mean inverse speed alone: ⟨v⟩ = ∫ v f d³v = 2 ∫₀^∞ v η(v) dv (by parts). */
import { gaussLegendre } from '../numeric/gauss-legendre.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

const RULE = gaussLegendre(16);
const PIECES = 24;

/** ⟨v⟩, km/s, by Gauss–Legendre quadrature between the kinks of η; 1e-9 relative (test/physics/halo/mean-speed.test.ts). */
export function meanSpeedKmPerS(halo: VelocityDistribution): number {
  const ends = [0, ...halo.kinksKmPerS, halo.largestSpeedKmPerS];
  let sum = 0;
  for (let i = 1; i < ends.length; i++) {
    const width = (ends[i] - ends[i - 1]) / PIECES;
    for (let p = 0; p < PIECES; p++) {
      for (let k = 0; k < RULE.nodes.length; k++) {
        const v = ends[i - 1] + width * (p + (1 + RULE.nodes[k]) / 2);
        sum += RULE.weights[k] * (width / 2) * 2 * v * halo.meanInverseSpeed(v);
      }
    }
  }
  return sum;
}
