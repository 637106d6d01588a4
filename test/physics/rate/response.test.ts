import { describe, expect, it } from 'vitest';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../../physics/constants.ts';
import { componentsHalo } from '../../../physics/halo/components.ts';
import type { GalacticVelocity } from '../../../physics/halo/galactic-velocity.ts';
import { speedTail, tailAt } from '../../../physics/halo/speed-tail.ts';
import { type Cutoff, standardHalo } from '../../../physics/halo/standard-halo.ts';
import { tabulatedGalacticHalo, tabulatedMeanInverseSpeed } from '../../../physics/halo/tabulated.ts';
import type { VelocityDistribution } from '../../../physics/halo/velocity-distribution.ts';
import { fanoIonization } from '../../../physics/ionization/fano.ts';
import { stepIonization } from '../../../physics/ionization/step.ts';
import type { Mediator } from '../../../physics/mediator/mediator.ts';
import { crystalRate, type RateScenario } from '../../../physics/rate/crystal-rate.ts';
import { type ResponseScenario, response, responseKernel, responseRates } from '../../../physics/rate/response.ts';
import { builtInTable } from '../../support/built-in-table.ts';
import { referenceTable } from '../../support/reference-table.ts';

const LABORATORY: GalacticVelocity = [11.1, 250.2, 7.3];
const standard = (v0: number, vEsc: number, vE: number, cutoff: Cutoff = 'sharp') =>
  standardHalo({ circularSpeedKmPerS: v0, escapeSpeedKmPerS: vEsc, laboratorySpeedKmPerS: vE, cutoff });
const part = (
  dispersionKmPerS: number | GalacticVelocity,
  meanVelocityKmPerS: GalacticVelocity = [0, 0, 0],
  weight = 1,
) => ({ weight, dispersionKmPerS, meanVelocityKmPerS, escapeSpeedKmPerS: 544 });
const components = (...parts: ReturnType<typeof part>[]) => componentsHalo(parts, LABORATORY);
const speeds = Array.from({ length: 400 }, (_, i) => (544 * i) / 399);

const HALOS: Record<string, VelocityDistribution> = {
  default: standard(238, 544, 250),
  June: standard(238, 544, 266.2),
  December: standard(238, 544, 237.2),
  smooth: standard(238, 544, 250, 'smooth'),
  slow: standard(200, 500, 220),
  fast: standard(260, 620, 275),
  'early escape': standard(238, 450, 250),
  'late escape': standard(238, 640, 250),
  'at rest': standard(220, 544, 0),
  'faster than escape': standard(150, 260, 300),
  disc: components(part(50, [0, 170, 0])),
  'halo and disc': components(part(168, [0, 0, 0], 0.8), part(50, [0, 170, 0], 0.2)),
  anisotropic: components(part([260, 110, 100])),
  elongated: components(part([300, 60, 60])),
  'moving, cut': components(part(150, [40, 100, -30])),
  'warm stream': components(part(20, [0, -200, 0])),
  'halo and narrow stream': components(part(168, [0, 0, 0], 0.9), part(5, [0, -250, 100], 0.1)),
  'anisotropic stream in a halo': components(part(168, [0, 0, 0], 0.7), part([20, 40, 30], [100, -200, 0], 0.3)),
  'tabulated F': tabulatedGalacticHalo(
    { speedsKmPerS: speeds, values: speeds.map((v) => v * v * Math.exp(-((v / 230) ** 2))) },
    250,
  ),
  'tabulated η': tabulatedMeanInverseSpeed({
    speedsKmPerS: [0, 100, 200, 300, 420, 540, 660, 800],
    values: [33, 30, 24, 16, 7, 2.2, 0.4, 0],
  }),
};
const FASTEST = Math.max(...Object.values(HALOS).map((halo) => halo.largestSpeedKmPerS));
const COLD = components(part(0, [0, -300, 0]));

const silicon = builtInTable('silicon', true).table;
const scenario = (change: Partial<ResponseScenario> = {}): ResponseScenario => ({
  massEv: 1e7,
  crossSectionCm2: 1e-37,
  mediator: { kind: 'heavy' },
  splittingEv: 0,
  localDensityGevPerCm3: 0.3,
  table: silicon,
  ionization: stepIonization(1.12, 3.8),
  energyPerPairEv: 3.8,
  maxElectrons: 12,
  ...change,
});
const direct = (s: ResponseScenario, halo: VelocityDistribution) => crystalRate({ ...s, halo } as RateScenario);
const MEDIATORS: Mediator[] = [{ kind: 'heavy' }, { kind: 'light' }, { kind: 'massive', massEv: 3e4 }];
const TABLES = { silicon, T1: referenceTable('T1'), T2: referenceTable('T2'), T3: referenceTable('T3') };

/** Largest relative difference over the bins that count: above 1e-6 of the total and not within 1 % of the grid from the halo's end. */
function largestDifference(s: ResponseScenario, halo: VelocityDistribution, rates: Float64Array) {
  const { bins, total } = direct(s, halo);
  const threshold = (e: number): number => Math.sqrt((2 * (e + s.splittingEv)) / s.massEv) * SPEED_OF_LIGHT_KM_PER_S;
  const margin = 0.01 * (FASTEST - threshold(bins[0].fromEv));
  let [largest, compared] = [0, 0];
  bins.forEach(({ rate, fromEv }, i) => {
    if (rate.value === 0) expect(rates[i]).toBe(0);
    if (!(rate.value > 1e-6 * total.value) || threshold(fromEv) > halo.largestSpeedKmPerS - margin) return;
    largest = Math.max(largest, Math.abs(rates[i] / rate.value - 1));
    compared++;
  });
  return { largest, compared };
}

describe('responseRates equals crystalRate within 1e-4, every bin above 1e-6 of the total, 20 halos', () => {
  const cases = Object.entries(TABLES).flatMap(([name, table], t) =>
    [0.6, 1, 3, 10, 200].map((mass, m) => ({ name, table, mass, mediator: MEDIATORS[(t + m) % 3] })),
  );
  it.each(cases)('$name, $mass MeV, $mediator.kind', ({ table, mass, mediator }) => {
    const s = scenario({ table, massEv: mass * 1e6, mediator });
    const kernel = response(s, FASTEST);
    let all = 0;
    for (const [name, halo] of Object.entries(HALOS)) {
      const { largest, compared } = largestDifference(s, halo, responseRates(kernel, halo));
      expect(largest, name).toBeLessThan(1e-4);
      all += compared;
    }
    expect(all).toBeGreaterThanOrEqual(14);
  });

  it('and with a mass splitting, and with Fano statistics, whose weights overlap', () => {
    const cases = [
      scenario({ splittingEv: 2, mediator: { kind: 'light' } }),
      scenario({ splittingEv: -0.5, massEv: 2e6 }),
      scenario({ ionization: fanoIonization(1.12, 3.8, 0.12) }),
    ];
    for (const s of cases) {
      const kernel = response(s, FASTEST);
      for (const name of ['default', 'smooth', 'halo and disc', 'tabulated F']) {
        const { largest, compared } = largestDifference(s, HALOS[name], responseRates(kernel, HALOS[name]));
        expect(compared).toBeGreaterThanOrEqual(2);
        expect(largest, name).toBeLessThan(1e-4);
      }
    }
  });
});

describe('response where η is a step: K integrated up to one speed, over that speed', () => {
  it.each(Object.entries(TABLES))('%s: equals crystalRate, 2e-4 with `steps`, 2e-3 with `smooth`', (_, table) => {
    for (const mass of [3, 10, 200]) {
      const s = scenario({ table, massEv: mass * 1e6 });
      const fine = response(s, FASTEST, 'steps');
      const viaRates = responseRates(fine, COLD);
      const { speedEdgesKmPerS: edges, kernels } = responseKernel(fine);
      const step = COLD.largestSpeedKmPerS;
      for (const [rates, tolerance] of [
        [viaRates, 2e-4],
        [responseRates(response(s, FASTEST), COLD), 2e-3],
      ] as const)
        expect(largestDifference(s, COLD, rates).largest, `${mass} MeV`).toBeLessThan(tolerance);
      kernels.forEach((kernel, bin) => {
        let sum = 0;
        kernel.forEach((value, cell) => {
          sum += value * Math.max(0, Math.min(edges[cell + 1], step) - edges[cell]);
        });
        // the cell in which the step falls is taken by its mean here
        if (viaRates[bin] > 1e-3 * viaRates[0]) expect(sum / step / viaRates[bin]).toBeCloseTo(1, 2);
      });
    }
  });
});

describe('response', () => {
  it('is linear in η: half of one halo and half of another', () => {
    const kernel = response(scenario(), FASTEST);
    const both = components(part(168, [0, 0, 0], 0.5), part(50, [0, 170, 0], 0.5));
    const [a, b] = [components(part(168)), components(part(50, [0, 170, 0]))].map((h) => responseRates(kernel, h));
    responseRates(kernel, both).forEach((rate, i) => {
      expect(rate).toBeCloseTo((a[i] + b[i]) / 2, 4 - Math.ceil(Math.log10(a[i] + b[i] + 1)));
    });
  });

  it('gives the cell means of K, with which the rate is Σ K [H(v) − H(v + dv)]', () => {
    const kernel = response(scenario(), FASTEST);
    const rates = responseRates(kernel, HALOS['default']);
    const { speedEdgesKmPerS: edges, kernels } = responseKernel(kernel);
    const tail = speedTail(HALOS['default'], 0);
    for (const bin of [0, 1, 2, 3]) {
      const sum = kernels[bin].reduce((r, k, i) => r + k * (tailAt(tail, edges[i]) - tailAt(tail, edges[i + 1])), 0);
      expect(sum / rates[bin]).toBeCloseTo(1, 4);
    }
  });

  it('is proportional to density and cross section, and empty below threshold', () => {
    const one = responseRates(response(scenario(), FASTEST), HALOS['default']);
    const six = responseRates(
      response(scenario({ localDensityGevPerCm3: 0.6, crossSectionCm2: 3e-37 }), FASTEST),
      HALOS['default'],
    );
    six.forEach((rate, i) => {
      expect(rate).toBeCloseTo(6 * one[i], 9 - Math.ceil(Math.log10(rate + 1)));
    });
    const below = response(scenario({ massEv: 1e5 }), FASTEST);
    expect(Array.from(responseRates(below, HALOS['default']))).toEqual(new Array(12).fill(0));
    expect(responseKernel(below).kernels).toEqual([]);
  });

  it('refuses a halo faster than it was made for, and speeds out of their domain', () => {
    const kernel = response(scenario(), 700);
    expect(() => responseRates(kernel, HALOS['default'])).toThrowError(
      expect.objectContaining({ parameter: ['halo'] }),
    );
    for (const speed of [0, Number.NaN, SPEED_OF_LIGHT_KM_PER_S])
      expect(() => response(scenario(), speed)).toThrowError(expect.objectContaining({ parameter: ['largestSpeed'] }));
  });
});
