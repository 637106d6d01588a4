/** The mean speed in the laboratory, from the mean inverse speed alone: ⟨v⟩ = ∫ v f d³v = 2 ∫₀^∞ v η(v) dv (by parts). */
import { gaussLegendre } from '../numeric/gauss-legendre.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

const RULE = gaussLegendre(16);
/** Pieces altogether, shared out among the stretches between kinks: 8 for each or more, one if there are more than this. */
const PIECES = 48;

/**
 * ⟨v⟩, km/s, by Gauss–Legendre quadrature between the kinks of η; 1e-9 relative for the standard halo
 * (test/physics/halo/speed-tail.test.ts), and what η itself is good to for the other models.
 */
export function meanSpeedKmPerS(halo: VelocityDistribution): number {
  const inside = [...halo.kinksKmPerS, ...(halo.sectionEndsKmPerS ?? [])].sort((a, b) => a - b);
  const ends = [0, ...inside, halo.largestSpeedKmPerS].filter((v, i, all) => i === 0 || v > all[i - 1]);
  const stretches = ends.length - 1;
  const count = stretches > PIECES ? 1 : Math.ceil(PIECES / Math.min(stretches, 6));
  let sum = 0;
  for (let i = 1; i < ends.length; i++) {
    const width = (ends[i] - ends[i - 1]) / count;
    for (let p = 0; p < count; p++) {
      for (let k = 0; k < RULE.nodes.length; k++) {
        const v = ends[i - 1] + width * (p + (1 + RULE.nodes[k]) / 2);
        sum += RULE.weights[k] * (width / 2) * 2 * v * halo.meanInverseSpeed(v);
      }
    }
  }
  return sum;
}
