/**
 * The ionization model with fluctuations: pairs spread normally about the mean, with Fano factor F (U. Fano, Phys. Rev. 72, 26
 * (1947)). With g the gap and ε the energy per pair, for E ≥ g:
 *
 *   N̄ = ½ + (E − g)/ε
 *   P(n|E) ∝ Φ((n + ½ − N̄)/√(F N̄)) − Φ((n − ½ − N̄)/√(F N̄)),   normalised over 1 ≤ n ≤ floor(E/g)
 *
 * The upper end is energy conservation, every pair costs at least the gap; there is none at g = 0. Where the ends do not bite
 * the mean of n is N̄ and its variance F N̄ + 1/12, not F N̄: the 1/12 is that of rounding to an integer. At F = 0, P jumps at
 * N̄ = n + ½, which are the edges of the step model.
 */
import { DomainError, requireNonNegative } from '../errors.ts';
import { gaussianCells, normalBetween } from '../numeric/gaussian-cells.ts';
import type { IonizationModel } from './ionization-model.ts';
import { stepIonization } from './step.ts';

/** Crystals have F near 0.1, uncorrelated pairs 1. */
const LARGEST_FANO_FACTOR = 10;
/** Below this the spread is less than the rounding of an energy: the step model. */
const SMALLEST_FANO_FACTOR = 1e-30;
/** See fanoIonization: 1.1e-5 for a spectrum that falls as exp(−E/ε). */
const SEGMENT_ERROR = 2e-5;
/** 1 − Φ of this is 6e-13: jumps and remainders beyond it are left out. */
const NEGLIGIBLE_Z = 7.1;

/**
 * The model. Its breaks are the multiples of the gap (where the normalisation jumps, as long as that is more than 1e-12) and a
 * ladder about each step edge (see `ladder`), so that its weights at the middles of the segments give the bin rates. For a
 * spectrum that falls as exp(−E/E₀) they are off by h²/(24 E₀²), h = ε/64, and a few 1e-6 from the jumps: together 1.1e-5 at
 * E₀ = ε, 6e-6 at 10 eV in silicon (measured, test/physics/ionization/fano.test.ts). F = 0 is the step model itself.
 *
 * @param bandGapEv g, eV, ≥ 0. @param energyPerPairEv ε, eV, > 0, ≥ g. @param fanoFactor F, 0…10.
 * @throws DomainError outside these. @example fanoIonization(1.12, 3.8, 0.12)
 */
export function fanoIonization(bandGapEv: number, energyPerPairEv: number, fanoFactor: number): IonizationModel {
  const step = stepIonization(bandGapEv, energyPerPairEv); // checks the gap and the energy per pair
  requireNonNegative('fanoFactor', fanoFactor);
  if (fanoFactor > LARGEST_FANO_FACTOR) {
    throw new DomainError('fanoFactor', fanoFactor, `at most ${LARGEST_FANO_FACTOR}`);
  }
  if (fanoFactor < SMALLEST_FANO_FACTOR) return step;

  return {
    bandGapEv,
    segmentError: SEGMENT_ERROR,
    lostFraction: () => 0,
    maxSegmentEv: Infinity, // the ladders are fine enough, and between them nothing changes
    breaksEv(fromEv, toEv) {
      const cuts = [
        ...normalisationJumps(bandGapEv, energyPerPairEv, fanoFactor, fromEv, toEv),
        ...ladders(bandGapEv, energyPerPairEv, fanoFactor, fromEv, toEv),
      ];
      const inside = cuts.filter((e) => e > fromEv && e < toEv).sort((a, b) => a - b);
      return inside.filter((e, i) => i === 0 || e > inside[i - 1]);
    },
    probabilities(energyEv, out) {
      out.fill(0);
      if (energyEv < bandGapEv) return;
      const most = Math.floor(energyEv / bandGapEv); // Infinity without a gap
      const mean = 0.5 + (energyEv - bandGapEv) / energyPerPairEv;
      const deviation = Math.sqrt(fanoFactor * mean);
      const norm = normalBetween((0.5 - mean) / deviation, (most + 0.5 - mean) / deviation);
      const count = Math.min(most, out.length);
      gaussianCells(mean, deviation, 1, out, count);
      for (let i = 0; i < count; i++) out[i] /= norm;
    },
    reachEv(electrons) {
      // N̄ with (N̄ − electrons − ½)/√(F N̄) = z, a quadratic in √N̄
      const half = (NEGLIGIBLE_Z * Math.sqrt(fanoFactor)) / 2;
      const mean = (half + Math.sqrt(half * half + electrons + 0.5)) ** 2;
      return bandGapEv + (mean - 0.5) * energyPerPairEv;
    },
  };
}

/**
 * Multiples k of the gap, eV: there n = k joins the normalisation, with weight 1 − Φ(z), z = (k − 1)(1 − g/ε)/√(F N̄) at least.
 * z grows with k, so the list ends where it is negligible, however small the gap.
 */
function normalisationJumps(gap: number, perPair: number, fanoFactor: number, from: number, to: number): number[] {
  const jumps: number[] = [];
  if (gap === 0) return jumps;
  for (let k = Math.max(2, Math.floor(from / gap)); k * gap < to; k++) {
    const mean = 0.5 + ((k - 1) * gap) / perPair;
    if ((k - 0.5 - mean) / Math.sqrt(fanoFactor * mean) > NEGLIGIBLE_Z) break;
    jumps.push(k * gap);
  }
  return jumps;
}

/** Rungs to an energy per pair, at most. */
const RUNGS_PER_PAIR = 64;
/** Rungs to a standard deviation of a narrow edge, and how many deviations (Φ: 3e-7) the ladder reaches to either side. */
const RUNGS_PER_DEVIATION = 6;
const DEVIATIONS = 5;

/** The ladders of every edge n ≥ 0 near [from, to]; the one at the gap, n = 0, has only its upper half. */
function ladders(gap: number, perPair: number, fanoFactor: number, from: number, to: number): number[] {
  const rungs: number[] = [];
  for (let n = Math.max(0, Math.floor((from - gap) / perPair)); gap + (n - 0.5) * perPair < to; n++) {
    rungs.push(...ladder(gap + n * perPair, perPair, perPair * Math.sqrt(fanoFactor * (n + 0.5))));
  }
  return rungs.filter((e) => e > gap);
}

/**
 * Energies, eV, about a step edge, over which P turns from n to n + 1 in a Gaussian of the given width. The ladder is uniform and
 * symmetric, so that in the midpoint rule all cancels but the slope of the spectrum. A wide edge needs a grid fine beside the
 * spectrum only, which meets that of its neighbours half-way; a narrow one a grid fine beside itself.
 */
function ladder(edgeEv: number, energyPerPairEv: number, widthEv: number): number[] {
  const wide = energyPerPairEv / RUNGS_PER_PAIR;
  const narrow = widthEv / RUNGS_PER_DEVIATION;
  if (wide <= narrow) {
    return Array.from({ length: RUNGS_PER_PAIR }, (_, i) => edgeEv + (i - RUNGS_PER_PAIR / 2) * wide);
  }
  const reach = RUNGS_PER_DEVIATION * DEVIATIONS;
  return Array.from({ length: 2 * reach + 1 }, (_, i) => edgeEv + (i - reach) * narrow);
}
