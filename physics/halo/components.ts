/**
 * A halo of several components, f = Σ wᵢ fᵢ with Σ wᵢ = 1: streams, a co-rotating disc, a radially anisotropic part
 * beside an isotropic one (for such decompositions: Evans, O'Hare & McCabe, PRD 99, 023012 (2019)). η is linear in f: η =
 * Σ wᵢ ηᵢ.
 */
import { DomainError, requirePositive } from '../errors.ts';
import type { GalacticVelocity } from './galactic-velocity.ts';
import { type GaussianComponent, gaussianComponent, largestComponentSpeedKmPerS } from './gaussian-component.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

export interface WeightedComponent extends GaussianComponent {
  /** Share of the local density, relative to the other components', > 0. */
  readonly weight: number;
}

/**
 * The components together, seen from a laboratory with this galactic velocity (km/s). Weights are divided by their sum.
 *
 * Accuracy: as gaussianComponent. Mean speed: meanSpeedKmPerS.
 *
 * @throws DomainError at ['components', i, …] for a component out of its domain or a weight that is not above 0, and for
 *   none
 * @example componentsHalo([{ weight: 1, dispersionKmPerS: 238 / Math.SQRT2, meanVelocityKmPerS: [0, 0, 0],
 *            escapeSpeedKmPerS: 544 }], [11.1, 250.2, 7.3])
 */
export function componentsHalo(
  components: readonly WeightedComponent[],
  laboratory: GalacticVelocity,
): VelocityDistribution {
  const { parts, weights } = weighted(components, (component) => gaussianComponent(component, laboratory));
  const largestSpeedKmPerS = Math.max(...parts.map((part) => part.largestSpeedKmPerS));
  const inside = (speeds: readonly number[]): number[] =>
    speeds
      .filter((v) => v > 0 && v < largestSpeedKmPerS)
      .sort((a, b) => a - b)
      .filter((v, i, all) => i === 0 || v > all[i - 1]);
  // where one component ends the sum has at least a kink, and a cold one jumps
  const sectionEndsKmPerS = inside(parts.flatMap(sectionEnds));
  return {
    largestSpeedKmPerS,
    kinksKmPerS: inside([...sectionEndsKmPerS, ...parts.flatMap((p) => [...p.kinksKmPerS, p.largestSpeedKmPerS])]),
    sectionEndsKmPerS,
    meanInverseSpeed: (v) => {
      let eta = 0;
      for (let i = 0; i < parts.length; i++) eta += weights[i] * parts[i].meanInverseSpeed(v);
      return eta;
    },
  };
}

/**
 * The largest speed of the components together in the laboratory, km/s, without the integrals.
 *
 * @throws DomainError as componentsHalo: a cheap check of what a caller wrote
 */
export function largestSpeedOfComponentsKmPerS(
  components: readonly WeightedComponent[],
  laboratory: GalacticVelocity,
): number {
  return Math.max(...weighted(components, (component) => largestComponentSpeedKmPerS(component, laboratory)).parts);
}

/** Something made of each component, and the components' shares. Errors say which component. */
function weighted<T>(components: readonly WeightedComponent[], make: (component: WeightedComponent) => T) {
  if (components.length === 0) throw new DomainError('components', '[]', 'at least one component');
  const parts = components.map((component, i) => {
    try {
      requirePositive('weight', component.weight);
      return make(component);
    } catch (error) {
      if (!(error instanceof DomainError) || error.parameter[0] === 'laboratoryVelocity') throw error;
      throw new DomainError(['components', i, ...error.parameter], error.value, error.allowed);
    }
  });
  const sum = components.reduce((total, { weight }) => total + weight, 0);
  if (!(sum < Infinity)) throw new DomainError('components', sum, 'weights with a finite sum');
  return { parts, weights: components.map(({ weight }) => weight / sum) };
}

/**
 * Speeds at which the whole halo's tables must begin anew because of one component: a steep one's two ends, a cold one's
 * step.
 */
function sectionEnds(part: VelocityDistribution): number[] {
  const largest = part.largestSpeedKmPerS;
  const isStep = part.meanInverseSpeed(largest * (1 - Number.EPSILON)) > 0.5 / largest;
  return isStep || part.sectionEndsKmPerS ? [...(part.sectionEndsKmPerS ?? []), largest] : [];
}
