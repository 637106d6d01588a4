/**
 * The step ionization model: E in the crystal frees exactly n = 1 + floor((E − bandGap)/energyPerPair) electrons, nothing
 * below the gap (Essig et al., JHEP 05 (2016) 046, eq. 5.1).
 */
import { DomainError, requireNonNegative, requirePositive } from '../errors.ts';
import type { IonizationModel } from './ionization-model.ts';

/**
 * Lower energy edge, eV, of the bin of n ≥ 1 electrons; the bin is [edge(n), edge(n+1)). Rounded to 14 digits: 1.12 + 2 × 3.8 is
 * 8.72, not 8.719999999999999.
 */
export function stepEdgeEv(bandGapEv: number, energyPerPairEv: number, electrons: number): number {
  return Number((bandGapEv + (electrons - 1) * energyPerPairEv).toPrecision(14));
}

/** The step model. Throws DomainError unless 0 ≤ bandGapEv ≤ energyPerPairEv and energyPerPairEv > 0, both finite. */
export function stepIonization(bandGapEv: number, energyPerPairEv: number): IonizationModel {
  requireNonNegative('bandGap', bandGapEv);
  requirePositive('energyPerPair', energyPerPairEv);
  if (energyPerPairEv < bandGapEv)
    throw new DomainError('energyPerPair', energyPerPairEv, `at least the band gap, ${bandGapEv} eV`);
  return {
    bandGapEv,
    maxSegmentEv: Infinity,
    segmentError: 0,
    reachEv: (electrons) => stepEdgeEv(bandGapEv, energyPerPairEv, electrons + 1),
    lostFraction: () => 0,
    breaksEv(fromEv, toEv) {
      const breaks: number[] = [];
      for (let n = Math.max(1, Math.floor((fromEv - bandGapEv) / energyPerPairEv)); ; n++) {
        const edge = stepEdgeEv(bandGapEv, energyPerPairEv, n);
        if (edge >= toEv) return breaks;
        if (edge > fromEv) breaks.push(edge);
      }
    },
    probabilities(energyEv, out) {
      out.fill(0);
      if (energyEv < bandGapEv) return;
      const index = Math.floor((energyEv - bandGapEv) / energyPerPairEv);
      if (index < out.length) out[index] = 1;
    },
  };
}
