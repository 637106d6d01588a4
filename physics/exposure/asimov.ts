/**
 * Median significances from the Asimov set, the data that equal their expectation: G. Cowan, K. Cranmer, E. Gross & O. Vitells,
 * Eur. Phys. J. C 71, 1554 (2011).
 *
 * Bin i expects μ s_i + Σ_j θ_j b_ij events. A background known only to the relative uncertainty r_j has a multiplier θ_j, common to
 * all bins, and an auxiliary Poisson measurement of mean θ_j/r_j² that observed 1/r_j² (T.-P. Li & Y.-Q. Ma, Astrophys. J. 272, 317
 * (1983) for one bin); r_j = 0 fixes θ_j = 1. The significance is √q, q = 2 ln of the ratio of the largest likelihood to the largest at
 * the tested μ, both over the θ.
 */
import { DomainError } from '../errors.ts';
import { type ProfileFit, profileFit } from './profile-fit.ts';

export interface BinnedBackground {
  /** For error messages. */
  readonly name: string;
  /** Expected events, or events per exposure, ≥ 0; one number a bin. */
  readonly perBin: readonly number[];
  /** r ≥ 0; 0 is a background known exactly. */
  readonly relativeUncertainty: number;
}

/** `discovery`: data with signal, tested for μ = 0. `exclusion`: data without, tested for μ = 1. */
export type AsimovTest = 'discovery' | 'exclusion';

export interface AsimovDeviance {
  /** q, the square of the significance; ∞ when a bin without background has signal and μ = 0 is tested. */
  readonly q: number;
  /**
   * The bins' part of q, the rest being the auxiliary measurements'. It is dq/d ln(exposure): q is a minimum over θ of exposure ×
   * (bins' part) + (auxiliary part), so it rises with exposure, ever more slowly.
   */
  readonly qOfBins: number;
}

/** q at a multiple of the given expectations (the exposure, where they are per exposure); multiple > 0. */
export type AsimovByExposure = (multiple: number) => AsimovDeviance;

const RELATIVE_TOLERANCE = 1e-13;

/**
 * Checks and lays out a test once; evaluated in microseconds (12 bins, 5 uncertain backgrounds: see test/bench/exposure.bench.ts).
 * Accuracy of q: 1e-10 relative against the closed one-bin form and a direct search (test/physics/exposure/asimov.test.ts).
 *
 * @param signal expected events s_i ≥ 0 (or rates), one a bin.
 * @throws DomainError for negative or infinite numbers and lists of different lengths.
 * @example asimovDeviance('discovery', [10], [{ name: 'flat', perBin: [9], relativeUncertainty: 0 }])(1).q // 2.8973²
 */
export function asimovDeviance(
  test: AsimovTest,
  signal: readonly number[],
  backgrounds: readonly BinnedBackground[],
): AsimovByExposure {
  checkBins(signal, backgrounds);
  const bins = signal.length;
  const total = totalBackground(bins, backgrounds);
  if (test === 'discovery' && signal.some((s, i) => s > 0 && total[i] === 0))
    return () => ({ q: Infinity, qOfBins: Infinity });
  const uncertain = backgrounds.filter((background) => background.relativeUncertainty > 0);
  const layout = multiplierFit(bins, uncertain, []);
  const { fit } = layout;
  return (multiple) => {
    layout.scale(multiple);
    for (let i = 0; i < bins; i++) {
      fit.counts[i] = multiple * (test === 'discovery' ? signal[i] + total[i] : total[i]);
      fit.offsets[i] = multiple * (test === 'discovery' ? -signal[i] : signal[i]);
      fit.means[i] = multiple * (test === 'discovery' ? total[i] : total[i] + signal[i]);
    }
    for (let j = 0; j < uncertain.length; j++) {
      fit.counts[bins + j] = 1 / uncertain[j].relativeUncertainty ** 2;
      fit.means[bins + j] = fit.counts[bins + j];
    }
    fit.parameters.fill(0);
    const q = 2 * fit.minimise(RELATIVE_TOLERANCE);
    return { q, qOfBins: 2 * fit.devianceOf(0, bins) };
  };
}

export interface MultiplierFit {
  /** Rows: the bins, then one auxiliary measurement for each background. Parameters: the free yields, then θ_j − 1. */
  readonly fit: ProfileFit;
  /** Sets the coefficients of the bins to a multiple of what was given. */
  scale(multiple: number): void;
}

/** The fit of the multipliers of `uncertain` backgrounds (each r > 0), and of yields μ ≥ 0 with the given shapes. */
export function multiplierFit(
  bins: number,
  uncertain: readonly BinnedBackground[],
  yields: readonly (readonly number[])[],
): MultiplierFit {
  const shapes = [...yields, ...uncertain.map((background) => background.perBin)];
  const rows = bins + uncertain.length;
  const coefficients = shapes.map(() => new Float64Array(rows));
  for (let j = 0; j < uncertain.length; j++) {
    coefficients[yields.length + j][bins + j] = 1 / uncertain[j].relativeUncertainty ** 2;
  }
  const lower = shapes.map((_, p) => (p < yields.length ? 0 : -1));
  const scale = (multiple: number): void => {
    for (let p = 0; p < shapes.length; p++) {
      for (let i = 0; i < bins; i++) coefficients[p][i] = multiple * shapes[p][i];
    }
  };
  return { fit: profileFit(rows, coefficients, lower), scale };
}

/** Summed background of each bin. */
export function totalBackground(bins: number, backgrounds: readonly BinnedBackground[]): number[] {
  return Array.from({ length: bins }, (_, i) => backgrounds.reduce((sum, background) => sum + background.perBin[i], 0));
}

/** Refuses an empty window, negative or infinite numbers, and lists of different lengths. */
export function checkBins(signal: readonly number[], backgrounds: readonly BinnedBackground[]): void {
  if (signal.length === 0) throw new DomainError('signal', signal.length, 'at least one bin');
  signal.forEach((s, i) => {
    if (!(s >= 0 && s < Infinity)) throw new DomainError(['signal', i], s, 'a finite number of at least 0');
  });
  backgrounds.forEach(({ perBin, relativeUncertainty }, j) => {
    if (perBin.length !== signal.length) {
      throw new DomainError(
        ['backgrounds', j, 'perBin'],
        perBin.length,
        `as many bins as the signal, ${signal.length}`,
      );
    }
    perBin.forEach((b, i) => {
      if (!(b >= 0 && b < Infinity))
        throw new DomainError(['backgrounds', j, 'perBin', i], b, 'a finite number of at least 0');
    });
    if (!(relativeUncertainty >= 0 && relativeUncertainty < Infinity)) {
      throw new DomainError(
        ['backgrounds', j, 'relativeUncertainty'],
        relativeUncertainty,
        'a finite number of at least 0',
      );
    }
  });
}
