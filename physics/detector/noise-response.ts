/**
 * Readout noise as a response matrix: k true electrons are read with a Gaussian error of rms σ electrons and rounded to the
 * nearest integer,
 *
 *   P(n|k) = Φ((n + ½ − k)/σ) − Φ((n − ½ − k)/σ),   n = 0…maxElectrons,
 *
 * where measured 0 takes all lower readings, and a last column what is read above maxElectrons: rows sum to 1.
 */
import { DomainError, requireNonNegative } from '../errors.ts';
import { gaussianCells, normalBetween } from '../numeric/gaussian-cells.ts';

/** A detector this noisy counts no electrons; it bounds the size of the matrix. */
const LARGEST_NOISE_ELECTRONS = 100;

/** σ, rms electrons, 0…100. @throws DomainError outside. */
function requireNoise(noiseElectrons: number): void {
  requireNonNegative('noise', noiseElectrons);
  if (noiseElectrons > LARGEST_NOISE_ELECTRONS) {
    throw new DomainError('noise', noiseElectrons, `at most ${LARGEST_NOISE_ELECTRONS} electrons`);
  }
}

/** An integer of at least 1. @throws DomainError otherwise. */
function requireMaxElectrons(maxElectrons: number): void {
  if (!(Number.isSafeInteger(maxElectrons) && maxElectrons >= 1)) {
    throw new DomainError('maxElectrons', maxElectrons, 'an integer of at least 1');
  }
}

/** What all true electrons beyond the last one followed may return to the measured bins, for a rate of 1 in each. */
const NEGLIGIBLE = 1e-9;

/**
 * The last true electron K ≥ maxElectrons to follow: the smallest with Σ_{k>K} P(n ≤ maxElectrons | k) < 1e-9, so that a true
 * spectrum that does not rise above K loses less than 1e-9 of its rate per electron. K = maxElectrons without noise.
 */
export function truncationElectron(noiseElectrons: number, maxElectrons: number): number {
  requireNoise(noiseElectrons);
  requireMaxElectrons(maxElectrons);
  if (noiseElectrons === 0) return maxElectrons;
  let last = maxElectrons + Math.ceil(10 * noiseElectrons); // ten deviations: 1e-23
  let returned = 0;
  for (; last > maxElectrons; last--) {
    returned += normalBetween(-Infinity, (maxElectrons + 0.5 - last) / noiseElectrons);
    if (returned >= NEGLIGIBLE) return last;
  }
  return maxElectrons;
}

/**
 * The matrix: row k = 0…lastElectron, columns n = 0…maxElectrons and at the end the one for all above. Row sums are 1 to 1e-15;
 * without noise it is the identity, exactly.
 *
 * @throws DomainError for σ outside 0…100 or maxElectrons not an integer of at least 1
 */
export function responseMatrix(noiseElectrons: number, maxElectrons: number, lastElectron: number): Float64Array[] {
  requireNoise(noiseElectrons);
  requireMaxElectrons(maxElectrons);
  return Array.from({ length: lastElectron + 1 }, (_, k) => {
    const row = new Float64Array(maxElectrons + 2);
    if (noiseElectrons === 0) {
      row[Math.min(k, maxElectrons + 1)] = 1;
      return row;
    }
    gaussianCells(k, noiseElectrons, 0, row, maxElectrons + 1);
    row[0] = normalBetween(-Infinity, (0.5 - k) / noiseElectrons);
    row[maxElectrons + 1] = normalBetween((maxElectrons + 0.5 - k) / noiseElectrons, Infinity);
    return row;
  });
}
