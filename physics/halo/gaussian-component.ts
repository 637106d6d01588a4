/**
 * One Gaussian of velocities in the galactic frame, with a dispersion for each of the axes U, V, W, cut where the galaxy
 * no longer holds a particle, seen from a laboratory that moves through it (the velocity ellipsoid of Schwarzschild 1907,
 * as used for dark matter by Evans, Carollo & de Zeeuw, MNRAS 318, 1131 (2000)):
 *
 *   f(g) ∝ exp(−Σᵢ (gᵢ − uᵢ)²/(2σᵢ²)) for |g| < v_esc,    g = w + V
 *
 *   u mean velocity · V the laboratory's · w velocity in the laboratory · σ one-dimensional dispersions (v₀ = √2 σ), km/s
 *
 * The cut is about the galaxy's rest frame whatever the mean velocity: it is the escape speed. In the laboratory, with n a
 * direction,
 *
 *   η(v) = ∫_v^∞ p(w) dw,    p(w) = w ∮ f(w n + V) dΩ,    1 = ∫ w p(w) dw
 *
 * Closed forms: σ = 0, a step at |u − V|; isotropic and at rest, the standard halo; isotropic and cut so far out that
 * less than 1e-12 of it is lost, the standard halo about its own mean. Else the two angles are done by quadrature
 * (Gauss–Legendre along an axis, trapezoid around it, which converges geometrically), w by Simpson's rule, and η is
 * tabulated as a cubic with its exact slopes −p.
 */
import { DomainError, requireNonNegative, requirePositive } from '../errors.ts';
import { gaussLegendre, type QuadratureRule } from '../numeric/gauss-legendre.ts';
import { intervalOf } from '../numeric/interval.ts';
import { type GalacticVelocity, requireVelocity, speedOf, velocityDifference } from './galactic-velocity.ts';
import { standardHalo } from './standard-halo.ts';
import type { VelocityDistribution } from './velocity-distribution.ts';

export interface GaussianComponent {
  /** σ, km/s: one number if isotropic, else along U, V, W. All 0: a cold stream. */
  readonly dispersionKmPerS: number | GalacticVelocity;
  /** u in the galactic frame, km/s. */
  readonly meanVelocityKmPerS: GalacticVelocity;
  /** v_esc about the galaxy's rest frame, km/s, above |u|. */
  readonly escapeSpeedKmPerS: number;
}

/** Largest ratio of two dispersions: the angular integral's cost grows with its square. */
const LARGEST_AXIS_RATIO = 10;
/** Most dispersions that the component's range of speeds may be wide: tables of η have sections of a few of them. */
const WIDEST_RANGE = 5000;
/** Smallest dispersion that is not 0, as a share of the largest speed: rounding swallows less. */
const SMALLEST_SHARE = 1e-9;
/** Gaussian tails are dropped from this many dispersions on: e^{−32} = 1e-14. */
const REACH = 8;
/** A cut this many dispersions from the mean takes less than 1e-12 of the component with it. */
const FAR_CUT = 7.5;
/**
 * The component in the laboratory.
 *
 * Accuracy of the quadrature: 1e-6 of η itself up to 0.9 of the largest speed, 1e-5 up to 0.995 (measured 3e-7 and 8e-6),
 * the closed forms as standardHalo (test/physics/halo/components.test.ts: equal axes, a seeded Monte Carlo). Cost: 15 ms
 * for axes within a factor 3, 100 ms for a factor 10; a closed form microseconds.
 *
 * @throws DomainError for a dispersion that is negative, one axis at 0 and another not, or axes further apart than
 *   LARGEST_AXIS_RATIO, or one far narrower than the speeds; a mean velocity at or above the escape speed; a cold stream
 *   at rest in the laboratory (η is infinite)
 */
export function gaussianComponent(component: GaussianComponent, laboratory: GalacticVelocity): VelocityDistribution {
  const outline = outlineOf(component, laboratory);
  const { axes, wind, cut, isFarCut, largestSpeedKmPerS } = outline;
  switch (outline.form) {
    case 'cold':
      return coldStream(wind);
    case 'closed':
      return withSections(
        standardHalo({
          circularSpeedKmPerS: Math.SQRT2 * axes[0],
          escapeSpeedKmPerS: cut,
          laboratorySpeedKmPerS: wind,
          cutoff: 'sharp',
        }),
        wind - cut,
        axes[0],
      );
    case 'ellipsoid': {
      const { meanVelocityKmPerS: mean, escapeSpeedKmPerS: vEsc } = component;
      return ellipsoid(axes, mean, vEsc, laboratory, isFarCut, largestSpeedKmPerS);
    }
  }
}

/**
 * The largest speed of a component in the laboratory, km/s, without the integrals: microseconds.
 *
 * @throws DomainError as gaussianComponent
 */
export function largestComponentSpeedKmPerS(component: GaussianComponent, laboratory: GalacticVelocity): number {
  return outlineOf(component, laboratory).largestSpeedKmPerS;
}

/** What a component is known by before any integral. */
interface Outline {
  readonly axes: GalacticVelocity;
  readonly form: 'cold' | 'closed' | 'ellipsoid';
  /** |u − V|, km/s. */
  readonly wind: number;
  /** The closed form's, about its own mean, km/s. */
  readonly cut: number;
  readonly isFarCut: boolean;
  readonly largestSpeedKmPerS: number;
}

function outlineOf(component: GaussianComponent, laboratory: GalacticVelocity): Outline {
  const { dispersionKmPerS, meanVelocityKmPerS: mean, escapeSpeedKmPerS: vEsc } = component;
  requirePositive('escapeSpeed', vEsc);
  requireVelocity('escapeSpeed', [vEsc, 0, 0]);
  requireVelocity('meanVelocity', mean);
  requireVelocity('laboratoryVelocity', laboratory);
  const axes: GalacticVelocity =
    typeof dispersionKmPerS === 'number' ? [dispersionKmPerS, dispersionKmPerS, dispersionKmPerS] : dispersionKmPerS;
  for (const sigma of axes) requireNonNegative('dispersion', sigma);
  const [smallest, largest] = [Math.min(...axes), Math.max(...axes)];
  requireVelocity('dispersion', [Math.SQRT2 * largest, 0, 0]);
  if (largest > LARGEST_AXIS_RATIO * smallest)
    throw new DomainError('dispersion', axes, `axes within a factor ${LARGEST_AXIS_RATIO} of one another, or all 0`);
  const meanSpeed = speedOf(mean);
  if (!(meanSpeed < vEsc)) throw new DomainError('meanVelocity', mean, `slower than the escape speed, ${vEsc} km/s`);

  const wind = speedOf(velocityDifference(mean, laboratory));
  const isFarCut = vEsc - meanSpeed > FAR_CUT * largest;
  if (largest === 0) {
    requireMoving(wind);
    return { axes, form: 'cold', wind, cut: 0, isFarCut, largestSpeedKmPerS: wind };
  }
  const isClosed = smallest === largest && (meanSpeed === 0 || isFarCut);
  const cut = isClosed && meanSpeed > 0 ? Math.min(vEsc - meanSpeed, REACH * largest) : vEsc;
  const largestSpeedKmPerS = isClosed ? cut + wind : Math.min(wind + REACH * largest, vEsc + speedOf(laboratory));
  const range = Math.min(largestSpeedKmPerS, isClosed ? 2 * cut : 2 * REACH * largest);
  if (range > WIDEST_RANGE * smallest || smallest < SMALLEST_SHARE * largestSpeedKmPerS)
    throw new DomainError('dispersion', axes, '0, or not so far below the speeds of the component');
  return { axes, form: isClosed ? 'closed' : 'ellipsoid', wind, cut, isFarCut, largestSpeedKmPerS };
}

function requireMoving(windKmPerS: number): void {
  if (!(windKmPerS > 0))
    throw new DomainError('meanVelocity', windKmPerS, 'other than the laboratory’s for a component without dispersion');
}

function coldStream(speedKmPerS: number): VelocityDistribution {
  return {
    largestSpeedKmPerS: speedKmPerS,
    kinksKmPerS: [],
    meanInverseSpeed: (v) => (v < speedKmPerS ? 1 / speedKmPerS : 0),
  };
}

/** Sections of η are no longer than this many of the smallest dispersion. */
const SECTION = 6;

/** η is constant below the smallest speed, if there is one, and falls from there on: tables need sections for that. */
function withSections(halo: VelocityDistribution, smallestSpeed: number, dispersion: number): VelocityDistribution {
  const sectionEndsKmPerS: number[] = [];
  for (
    let v = smallestSpeed > 0 ? smallestSpeed : SECTION * dispersion;
    v < halo.largestSpeedKmPerS;
    v += SECTION * dispersion
  )
    sectionEndsKmPerS.push(v);
  return sectionEndsKmPerS.length > 0 ? { ...halo, sectionEndsKmPerS } : halo;
}

/** Gauss–Legendre rules and trapezoid angles by number of nodes, rounded up so that few are ever made. */
const NODES_STEP = 8;
const rules = new Map<number, QuadratureRule>();
const circles = new Map<number, { readonly cosines: Float64Array; readonly sines: Float64Array }>();

function ruleOf(nodes: number): QuadratureRule {
  const known = rules.get(nodes) ?? gaussLegendre(nodes);
  rules.set(nodes, known);
  return known;
}

function circleOf(nodes: number) {
  const angle = (_: unknown, i: number): number => (2 * Math.PI * (i + 0.5)) / nodes;
  const known = circles.get(nodes) ?? {
    cosines: Float64Array.from({ length: nodes }, (_, i) => Math.cos(angle(_, i))),
    sines: Float64Array.from({ length: nodes }, (_, i) => Math.sin(angle(_, i))),
  };
  circles.set(nodes, known);
  return known;
}

/** Two unit vectors across a unit vector and across each other. */
function across(a: GalacticVelocity): readonly [GalacticVelocity, GalacticVelocity] {
  const i = a.map(Math.abs).indexOf(Math.min(...a.map(Math.abs)));
  const along = [0, 1, 2].map((k) => (k === i ? 1 : 0) - a[i] * a[k]) as unknown as GalacticVelocity;
  const length = speedOf(along);
  const e: GalacticVelocity = [along[0] / length, along[1] / length, along[2] / length];
  return [e, [a[1] * e[2] - a[2] * e[1], a[2] * e[0] - a[0] * e[2], a[0] * e[1] - a[1] * e[0]]];
}

/**
 * p(w) of an ellipsoid, unnormalised. With a the axis of the integral, n = a(1 − m) + √(m(2 − m)) (cos φ e₁ + sin φ e₂),
 * so that small angles keep their digits. A cut that matters is a limit on m if a points against the laboratory's motion:
 *
 *   |w n + V| < v_esc  ⇔  m < (v_esc − w + V)(v_esc + w − V)/(2 w V)
 */
function angularIntegral(
  axes: GalacticVelocity,
  mean: GalacticVelocity,
  vEsc: number,
  laboratory: GalacticVelocity,
  isFarCut: boolean,
): (w: number) => number {
  const wind = velocityDifference(laboratory, mean); // V − u
  const against = isFarCut ? wind : laboratory;
  const speed = speedOf(against);
  const a: GalacticVelocity = speed > 0 ? [-against[0] / speed, -against[1] / speed, -against[2] / speed] : [1, 0, 0];
  const [e1, e2] = across(a);
  const [smallest, largest] = [Math.min(...axes), Math.max(...axes)];
  const curvature = (1 / smallest ** 2 - 1 / largest ** 2) / 2;
  const gradient = speedOf([wind[0] / axes[0] ** 2, wind[1] / axes[1] ** 2, wind[2] / axes[2] ** 2]);
  /** Over the sphere the exponent varies by 2κ at most, but no more than that is above e^{−REACH²/2}. */
  const mostVariation = (REACH * (largest / smallest)) ** 2 / 2;

  return (w) => {
    let mEnd = 2;
    if (isFarCut) {
      const sine = (REACH * largest) / w;
      if (speed > REACH * largest && sine < 1) mEnd = Math.min(2, (sine * sine) / (1 + Math.sqrt(1 - sine * sine)));
    } else if (speed > 0) {
      mEnd = Math.min(2, ((vEsc - w + speed) * (vEsc + w - speed)) / (2 * w * speed));
    } else if (w >= vEsc) return 0;
    if (!(mEnd > 0)) return 0;
    const variation = Math.min(w * (w * curvature + gradient), mostVariation);
    const sharpness = Math.sqrt(variation);
    const nodes = NODES_STEP * Math.ceil((12 + 3 * sharpness) / NODES_STEP);
    const turns = NODES_STEP * Math.ceil((12 + 6 * sharpness) / NODES_STEP);
    const { nodes: xs, weights } = ruleOf(nodes);
    const { cosines, sines } = circleOf(turns);
    let sum = 0;
    for (let i = 0; i < nodes; i++) {
      const m = (mEnd / 2) * (1 + xs[i]);
      const side = w * Math.sqrt(m * (2 - m));
      const [b0, b1, b2] = [0, 1, 2].map((k) => (w * a[k] + wind[k] - w * m * a[k]) / axes[k]);
      const [c0, c1, c2] = [0, 1, 2].map((k) => (side * e1[k]) / axes[k]);
      const [d0, d1, d2] = [0, 1, 2].map((k) => (side * e2[k]) / axes[k]);
      let ring = 0;
      for (let j = 0; j < turns; j++) {
        const x0 = b0 + c0 * cosines[j] + d0 * sines[j];
        const x1 = b1 + c1 * cosines[j] + d1 * sines[j];
        const x2 = b2 + c2 * cosines[j] + d2 * sines[j];
        ring += Math.exp(-(x0 * x0 + x1 * x1 + x2 * x2) / 2);
      }
      sum += (weights[i] * ring) / turns;
    }
    return w * Math.PI * mEnd * sum; // 2π · mEnd/2
  };
}

/**
 * Panels for w are this share of the smallest dispersion wide, less in the tail, where η falls faster and faster, and
 * towards the largest speed this share of the distance to it.
 */
const PANEL_SHARE = 1 / 20;
const EDGE_SHARE = 1 / 3;
/** Where that ends, as a share of the largest speed. */
const EDGE_END = 1e-5;

/** Panel boundaries between two speeds, none further apart than `widest` allows there. */
function panelEnds(from: number, kinks: readonly number[], to: number, widest: (w: number) => number): number[] {
  const ends = [from];
  for (const stop of [...kinks, to]) {
    for (let v = ends[ends.length - 1]; v < stop; ) {
      const left = to - v;
      const width = Math.min(widest(v), Math.max(EDGE_SHARE * left, EDGE_END * to));
      v = stop - v < 1.5 * width ? stop : v + width;
      ends.push(v);
    }
  }
  return ends;
}

function ellipsoid(
  axes: GalacticVelocity,
  mean: GalacticVelocity,
  vEsc: number,
  laboratory: GalacticVelocity,
  isFarCut: boolean,
  largestSpeedKmPerS: number,
): VelocityDistribution {
  const wind = speedOf(velocityDifference(mean, laboratory));
  const reach = REACH * Math.max(...axes);
  const laboratorySpeed = speedOf(laboratory);
  const smallest = Math.max(0, wind - reach, isFarCut ? 0 : laboratorySpeed - vEsc);
  const kink = vEsc - laboratorySpeed;
  const kinksKmPerS = !isFarCut && laboratorySpeed > 0 && kink > smallest && kink < largestSpeedKmPerS ? [kink] : [];
  const widest = (w: number): number =>
    (PANEL_SHARE * Math.min(...axes)) / Math.max(1, Math.abs(w - wind) / (2 * Math.max(...axes)));
  const ends = panelEnds(smallest, kinksKmPerS, largestSpeedKmPerS, widest);
  const p = angularIntegral(axes, mean, vEsc, laboratory, isFarCut);

  const eta = new Float64Array(ends.length);
  const slopes = Float64Array.from(ends, (w) => -p(w));
  slopes[ends.length - 1] = 0;
  let norm = 0;
  for (let i = ends.length - 2; i >= 0; i--) {
    const [a, b] = [ends[i], ends[i + 1]];
    const middle = (a + b) / 2;
    const atMiddle = p(middle);
    const third = (b - a) / 6;
    eta[i] = eta[i + 1] + third * (-slopes[i] + 4 * atMiddle - slopes[i + 1]);
    norm += third * (-a * slopes[i] + 4 * middle * atMiddle - b * slopes[i + 1]);
  }

  const meanInverseSpeed = (v: number): number => {
    if (v >= largestSpeedKmPerS) return 0;
    if (v <= smallest) return eta[0] / norm;
    const low = intervalOf(ends, v);
    const high = low + 1;
    const width = ends[high] - ends[low];
    const t = (v - ends[low]) / width;
    const drop = eta[low] - eta[high];
    const [s0, s1] = [slopes[low] * width, slopes[high] * width];
    const cubic = eta[low] + t * (s0 + t * (-3 * drop - 2 * s0 - s1 + t * (2 * drop + s0 + s1)));
    return Math.max(0, cubic) / norm;
  };
  return withSections({ largestSpeedKmPerS, kinksKmPerS, meanInverseSpeed }, smallest, Math.min(...axes));
}
