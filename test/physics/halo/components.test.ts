import { describe, expect, it } from 'vitest';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../../physics/constants.ts';
import { seededRandom } from '../../../physics/exposure/random.ts';
import {
  componentsHalo,
  largestSpeedOfComponentsKmPerS,
  type WeightedComponent,
} from '../../../physics/halo/components.ts';
import { type GalacticVelocity, speedOf, velocityDifference } from '../../../physics/halo/galactic-velocity.ts';
import { meanSpeedKmPerS } from '../../../physics/halo/mean-speed.ts';
import { speedTail, tailAt } from '../../../physics/halo/speed-tail.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';

const LABORATORY: GalacticVelocity = [11.1, 250.2, 7.3];
const SPEED = speedOf(LABORATORY);
const SIGMA = 238 / Math.SQRT2;
const AT_REST: GalacticVelocity = [0, 0, 0];

const component = (change: Partial<WeightedComponent> = {}): WeightedComponent => ({
  weight: 1,
  dispersionKmPerS: SIGMA,
  meanVelocityKmPerS: AT_REST,
  escapeSpeedKmPerS: 544,
  ...change,
});
const standard = (sigma: number, vEsc: number, vE: number) =>
  standardHalo({
    circularSpeedKmPerS: Math.SQRT2 * sigma,
    escapeSpeedKmPerS: vEsc,
    laboratorySpeedKmPerS: vE,
    cutoff: 'sharp',
  });
/** Axes equal but for the last digits: the two-dimensional quadrature and not the closed form is used. */
const nearlyEqual = (sigma: number): GalacticVelocity => [sigma, sigma * (1 + 1e-12), sigma];

const MODELS: Record<string, readonly WeightedComponent[]> = {
  'isotropic at rest': [component()],
  'isotropic, moving, cut by the escape speed': [component({ meanVelocityKmPerS: [60, 120, -30] })],
  'a co-rotating disc': [component({ dispersionKmPerS: 50, meanVelocityKmPerS: [0, 170, 0] })],
  'radially anisotropic': [component({ dispersionKmPerS: [260, 110, 105] })],
  'tilted against its own motion': [component({ dispersionKmPerS: [90, 60, 40], meanVelocityKmPerS: [-150, 80, 100] })],
  'a warm stream': [component({ dispersionKmPerS: 12, meanVelocityKmPerS: [-20, -280, 10] })],
  'an anisotropic stream': [component({ dispersionKmPerS: [10, 20, 15], meanVelocityKmPerS: [0, -290, 0] })],
  'halo, anisotropic part, disc and stream': [
    component({ weight: 0.6 }),
    component({ weight: 0.2, dispersionKmPerS: [260, 110, 105], escapeSpeedKmPerS: 528 }),
    component({ weight: 0.15, dispersionKmPerS: 50, meanVelocityKmPerS: [0, 170, 0] }),
    component({ weight: 0.05, dispersionKmPerS: 3, meanVelocityKmPerS: [100, -200, 50] }),
  ],
};

describe('componentsHalo: closed forms', () => {
  it('is the standard halo for one isotropic component at rest, to 1e-9', () => {
    for (const vEsc of [300, 544, 600]) {
      const [halo, expected] = [
        componentsHalo([component({ escapeSpeedKmPerS: vEsc })], LABORATORY),
        standard(SIGMA, vEsc, SPEED),
      ];
      expect(halo.largestSpeedKmPerS).toBeCloseTo(expected.largestSpeedKmPerS, 9);
      for (let v = 0; v < vEsc + SPEED; v += 10)
        expect(Math.abs(halo.meanInverseSpeed(v) / expected.meanInverseSpeed(v) - 1), `${v}`).toBeLessThan(1e-9);
      expect(halo.meanInverseSpeed(vEsc + SPEED + 1e-9)).toBe(0);
    }
  });

  it('is the same by quadrature over the angles, for equal axes: 1e-6 up to 0.9 v_max, 1e-5 up to 0.995, wherever the cut lies', () => {
    let largest = 0;
    for (const [sigma, vEsc] of [
      [SIGMA, 544],
      [SIGMA, 200],
      [100, 544],
      [SIGMA, 1500],
      [40, 544],
    ]) {
      const halo = componentsHalo(
        [component({ dispersionKmPerS: nearlyEqual(sigma), escapeSpeedKmPerS: vEsc })],
        LABORATORY,
      );
      const expected = standard(sigma, vEsc, SPEED);
      for (let v = 0; v < 0.995 * Math.min(halo.largestSpeedKmPerS, SPEED + 5.5 * sigma); v += 3.1) {
        const off = Math.abs(halo.meanInverseSpeed(v) / expected.meanInverseSpeed(v) - 1);
        largest = Math.max(largest, off);
        expect(off, `σ ${sigma}, v_esc ${vEsc}, v ${v}`).toBeLessThan(v < 0.9 * halo.largestSpeedKmPerS ? 1e-6 : 1e-5);
      }
    }
    expect(largest).toBeGreaterThan(1e-13); // the quadrature was indeed another way
  });

  it('is the halo about its own mean for a moving component the cut does not touch, isotropic or by quadrature', () => {
    const mean: GalacticVelocity = [-20, -180, 10];
    const wind = speedOf(velocityDifference(mean, LABORATORY));
    for (const sigma of [1, 10, 45]) {
      const expected = standard(sigma, 8 * sigma, wind);
      for (const dispersionKmPerS of [sigma, nearlyEqual(sigma)]) {
        const halo = componentsHalo([component({ dispersionKmPerS, meanVelocityKmPerS: mean })], LABORATORY);
        for (let v = wind - 5 * sigma; v < wind + 5 * sigma; v += sigma / 7)
          expect(
            Math.abs(halo.meanInverseSpeed(v) / expected.meanInverseSpeed(v) - 1),
            `σ ${sigma}, ${v}`,
          ).toBeLessThan(1e-6);
      }
    }
  });

  it('is a step of height 1/|u − V| at that speed for a cold stream, and tends to it as the dispersion falls', () => {
    const mean: GalacticVelocity = [0, -300, 40];
    const speed = speedOf(velocityDifference(mean, LABORATORY));
    const of = (dispersionKmPerS: number) =>
      componentsHalo([component({ dispersionKmPerS, meanVelocityKmPerS: mean })], LABORATORY);
    const cold = of(0);
    expect(cold.largestSpeedKmPerS).toBe(speed);
    for (const v of [0, 100, speed * (1 - 1e-15)]) expect(cold.meanInverseSpeed(v)).toBe(1 / speed);
    for (const v of [speed, speed + 1]) expect(cold.meanInverseSpeed(v)).toBe(0);
    expect(meanSpeedKmPerS(cold)).toBeCloseTo(speed, 9);
    for (const sigma of [1e-3, 0.1]) {
      expect(of(sigma).meanInverseSpeed(speed - 9 * sigma) * speed).toBeCloseTo(1, 6);
      expect(of(sigma).meanInverseSpeed(speed) * speed).toBeCloseTo(0.5, 2);
      expect(of(sigma).meanInverseSpeed(speed + 9 * sigma)).toBe(0);
    }
  });

  it('is linear: η = Σ wᵢ ηᵢ with the weights divided by their sum', () => {
    const [a, b] = [
      component({ weight: 3 }),
      component({ weight: 1, dispersionKmPerS: 0, meanVelocityKmPerS: [0, -200, 0] }),
    ];
    const both = componentsHalo([a, b], LABORATORY);
    const [etaA, etaB] = [a, b].map((one) => componentsHalo([one], LABORATORY).meanInverseSpeed);
    for (const v of [0, 200, 440, 460, 700])
      expect(both.meanInverseSpeed(v)).toBeCloseTo(0.75 * etaA(v) + 0.25 * etaB(v), 15);
  });

  it('does not depend on how the frame is turned: the axes of the ellipsoid with the velocities', () => {
    const plain = componentsHalo(
      [component({ dispersionKmPerS: [200, 90, 60], meanVelocityKmPerS: [30, 50, 0] })],
      LABORATORY,
    );
    const turned = componentsHalo(
      [component({ dispersionKmPerS: [60, 200, 90], meanVelocityKmPerS: [0, 30, 50] })],
      [LABORATORY[2], LABORATORY[0], LABORATORY[1]],
    );
    for (const v of [0, 100, 300, 500, 700])
      expect(turned.meanInverseSpeed(v) / plain.meanInverseSpeed(v)).toBeCloseTo(1, 7);
  });
});

describe.each(Object.entries(MODELS))('componentsHalo: %s', (_, components) => {
  const halo = componentsHalo(components, LABORATORY);

  it('has ∫ η dv = 1, falls with v and is 0 from the largest speed on', () => {
    expect(tailAt(speedTail(halo, 0), 0)).toBeCloseTo(1, 6);
    let above = 0;
    for (let i = 400; i >= 0; i--) {
      const eta = halo.meanInverseSpeed((halo.largestSpeedKmPerS * i) / 400);
      expect(eta).toBeGreaterThanOrEqual(above * (1 - 1e-7));
      above = eta;
    }
    expect(halo.meanInverseSpeed(halo.largestSpeedKmPerS)).toBe(0);
  });

  it('agrees with 10⁶ seeded velocities within 4 standard errors: ⟨v⟩ and η at ten speeds', () => {
    const random = seededRandom(20260602);
    const samples = 1_000_000;
    const speeds = Array.from({ length: 10 }, (_, i) => (meanSpeedKmPerS(halo) * i) / 7);
    const [sums, squares] = [new Float64Array(11), new Float64Array(11)];
    let drawn = 0;
    while (drawn < samples) {
      const g = velocityOf(components, random);
      const v = speedOf(velocityDifference(g, LABORATORY));
      for (let k = 0; k < 10 && v > speeds[k]; k++) {
        sums[k] += 1 / v;
        squares[k] += 1 / v ** 2;
      }
      sums[10] += v;
      squares[10] += v * v;
      drawn++;
    }
    const expected = [...speeds.map(halo.meanInverseSpeed), meanSpeedKmPerS(halo)];
    let compared = 0;
    expected.forEach((value, k) => {
      const mean = sums[k] / samples;
      if (value * samples * halo.largestSpeedKmPerS < 30) return; // a handful of particles: no Gaussian error
      const standardError = Math.sqrt((squares[k] / samples - mean * mean) / samples);
      expect(Math.abs(mean - value), `${k}: ${value}, sampled ${mean} ± ${standardError}`).toBeLessThan(
        4 * standardError + 1e-9 * value,
      );
      compared++;
    });
    expect(compared).toBeGreaterThanOrEqual(8);
  });
});

/** One velocity in the galactic frame, km/s: a component by its weight, then rejection at its escape speed. */
function velocityOf(components: readonly WeightedComponent[], random: () => number): GalacticVelocity {
  const all = components.reduce((sum, { weight }) => sum + weight, 0);
  let left = random() * all;
  const chosen =
    components.find(({ weight }) => {
      left -= weight;
      return left < 0;
    }) ?? components[0];
  const { dispersionKmPerS: s, meanVelocityKmPerS: mean, escapeSpeedKmPerS } = chosen;
  const axes = typeof s === 'number' ? [s, s, s] : s;
  const normal = (): number => Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());
  while (true) {
    const g: GalacticVelocity = [
      mean[0] + axes[0] * normal(),
      mean[1] + axes[1] * normal(),
      mean[2] + axes[2] * normal(),
    ];
    if (speedOf(g) < escapeSpeedKmPerS) return g;
  }
}

describe('componentsHalo: wrong input, named', () => {
  const cases: [string, Partial<WeightedComponent>, (string | number)[]][] = [
    ['a weight of 0', { weight: 0 }, ['components', 1, 'weight']],
    ['a negative dispersion', { dispersionKmPerS: -1 }, ['components', 1, 'dispersion']],
    ['one axis without dispersion', { dispersionKmPerS: [100, 100, 0] }, ['components', 1, 'dispersion']],
    ['axes too far apart', { dispersionKmPerS: [110, 100, 10] }, ['components', 1, 'dispersion']],
    ['a mean velocity beyond escape', { meanVelocityKmPerS: [0, 600, 0] }, ['components', 1, 'meanVelocity']],
    ['a dispersion lost beside the speeds', { dispersionKmPerS: 0.01 }, ['components', 1, 'dispersion']],
    [
      'one that rounding swallows',
      { dispersionKmPerS: 1e-20, meanVelocityKmPerS: [0, 1, 0] },
      ['components', 1, 'dispersion'],
    ],
    ['a superluminal escape speed', { escapeSpeedKmPerS: SPEED_OF_LIGHT_KM_PER_S }, ['components', 1, 'escapeSpeed']],
    ['a velocity that is no number', { meanVelocityKmPerS: [0, Number.NaN, 0] }, ['components', 1, 'meanVelocity']],
    [
      'a cold stream that rests in the laboratory',
      { dispersionKmPerS: 0, meanVelocityKmPerS: LABORATORY },
      ['components', 1, 'meanVelocity'],
    ],
  ];
  it.each(cases)('refuses %s', (_, change, parameter) => {
    expect(() => componentsHalo([component(), component(change)], LABORATORY)).toThrowError(
      expect.objectContaining({ parameter }),
    );
  });

  it('refuses no components and a laboratory at the speed of light', () => {
    expect(() => componentsHalo([], LABORATORY)).toThrowError(expect.objectContaining({ parameter: ['components'] }));
    expect(() => componentsHalo([component()], [3e5, 0, 0])).toThrowError(
      expect.objectContaining({ parameter: ['laboratoryVelocity'] }),
    );
  });
});

describe('largestSpeedOfComponentsKmPerS', () => {
  it('is the largest speed of componentsHalo, of every form of component', () => {
    const cases: Partial<WeightedComponent>[] = [
      {},
      { dispersionKmPerS: 0, meanVelocityKmPerS: [0, -300, 0] },
      { dispersionKmPerS: 10, meanVelocityKmPerS: [0, -300, 0] },
      { dispersionKmPerS: [200, 100, 120] },
      { dispersionKmPerS: [40, 30, 20], meanVelocityKmPerS: [10, 100, 0] },
      { dispersionKmPerS: [40, 30, 20], meanVelocityKmPerS: [10, 500, 0] },
    ];
    const halos = cases.map((change) => [component(change)]);
    for (const components of [...halos, halos.flat()])
      expect(largestSpeedOfComponentsKmPerS(components, LABORATORY)).toBe(
        componentsHalo(components, LABORATORY).largestSpeedKmPerS,
      );
  });
});

describe('componentsHalo near the escape speed', () => {
  it('a narrow ellipsoid that the cut divides: as the closed form’s moments, ∫ η dv = 1 and ⟨v⟩ near |u − V|', () => {
    const halo = componentsHalo(
      [component({ dispersionKmPerS: [2, 2.2, 1.8], meanVelocityKmPerS: [0, -542, 0] })],
      LABORATORY,
    );
    const tail = speedTail(halo, 0);
    expect(tailAt(tail, 0)).toBeCloseTo(1, 6);
    // the cut takes the outer side: the mean lies within a dispersion or two inside of 792.3 km/s
    const mean = meanSpeedKmPerS(halo);
    expect(mean).toBeLessThan(792.4);
    expect(mean).toBeGreaterThan(792.3 - 2 * 2.2);
  });
});
