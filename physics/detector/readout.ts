/**
 * The readout: from rates of true electrons to rates of measured electrons, noise first, then efficiency,
 *
 *   measured_n = efficiency_n Σ_k P(n|k) true_k.
 *
 * An event without charge (k = 0) is an empty pixel; those come from the dark current alone.
 */
import { DomainError } from '../errors.ts';
import { responseMatrix, truncationElectron } from './noise-response.ts';

export interface Readout {
  /** σ, rms electrons, 0…100. */
  readonly noiseElectrons: number;
  /** 0…1: one number, or one for each measured bin 0…maxElectrons. */
  readonly efficiency: number | readonly number[];
  /** The last measured bin, an integer ≥ 1. It is no overflow bin. */
  readonly maxElectrons: number;
}

export interface MeasuredRates {
  /** Rate in measured bin n = 0…maxElectrons, in the unit of the true rates. */
  readonly bins: Float64Array;
  /** What the noise puts above the last bin, before any efficiency: with it, rates at efficiency 1 add up to the true ones. */
  readonly above: number;
}

export interface ReadoutResponse {
  readonly maxElectrons: number;
  /** The last true electron K that is followed; what lies beyond returns less than 1e-9 of its rate (truncationElectron). */
  readonly lastElectron: number;
  /** P(n|k) of the noise alone: rows k = 0…K, columns n = 0…maxElectrons and all above. Rows sum to 1. */
  readonly matrix: readonly Float64Array[];
  /** The efficiency of each measured bin 0…maxElectrons. */
  readonly efficiency: Float64Array;
  /** Measured rates from the true rates of k = 0, 1, …; at most K + 1 of them, those absent are 0. */
  apply(trueRates: ArrayLike<number>): MeasuredRates;
}

/**
 * The response, precomputed. Without noise and with efficiency 1 the bins are the true rates, exactly.
 *
 * @throws DomainError for a parameter outside its domain, or an efficiency list of another length than the measured bins
 * @example readoutResponse({ noiseElectrons: 0.16, efficiency: 0.9, maxElectrons: 12 }).apply([0, 5, 3, 1])
 */
export function readoutResponse(readout: Readout): ReadoutResponse {
  const { noiseElectrons, maxElectrons } = readout;
  const lastElectron = truncationElectron(noiseElectrons, maxElectrons);
  const matrix = responseMatrix(noiseElectrons, maxElectrons, lastElectron);
  const efficiency = efficiencyPerBin(readout.efficiency, maxElectrons);
  return {
    maxElectrons,
    lastElectron,
    matrix,
    efficiency,
    apply(trueRates) {
      if (trueRates.length > lastElectron + 1) {
        throw new DomainError('trueRates', trueRates.length, `at most ${lastElectron + 1} numbers`);
      }
      const sums = new Float64Array(maxElectrons + 2);
      for (let k = 0; k < trueRates.length; k++) {
        for (let n = 0; n < sums.length; n++) sums[n] += matrix[k][n] * trueRates[k];
      }
      return { bins: efficiency.map((share, n) => share * sums[n]), above: sums[maxElectrons + 1] };
    },
  };
}

function efficiencyPerBin(efficiency: number | readonly number[], maxElectrons: number): Float64Array {
  if (typeof efficiency === 'number') {
    requireShare(['efficiency'], efficiency);
    return new Float64Array(maxElectrons + 1).fill(efficiency);
  }
  if (efficiency.length !== maxElectrons + 1) {
    throw new DomainError(
      'efficiency',
      efficiency.length,
      `one for each of the ${maxElectrons + 1} measured bins from 0`,
    );
  }
  efficiency.forEach((share, n) => void requireShare(['efficiency', n], share));
  return Float64Array.from(efficiency);
}

function requireShare(path: readonly (string | number)[], share: number): void {
  if (!(share >= 0 && share <= 1)) throw new DomainError(path, share, 'from 0 to 1');
}
