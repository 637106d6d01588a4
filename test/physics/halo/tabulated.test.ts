import { describe, expect, it } from 'vitest';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../../physics/constants.ts';
import { seededRandom } from '../../../physics/exposure/random.ts';
import { meanSpeedKmPerS } from '../../../physics/halo/mean-speed.ts';
import { speedTail, tailAt } from '../../../physics/halo/speed-tail.ts';
import { standardHalo } from '../../../physics/halo/standard-halo.ts';
import {
  type SpeedTable,
  tabulatedGalacticHalo,
  tabulatedLaboratoryHalo,
  tabulatedMeanInverseSpeed,
} from '../../../physics/halo/tabulated.ts';

const [V0, V_E, V_ESC] = [238, 250, 544];
const standard = standardHalo({
  circularSpeedKmPerS: V0,
  laboratorySpeedKmPerS: V_E,
  escapeSpeedKmPerS: V_ESC,
  cutoff: 'sharp',
});
const tableOf = (f: (v: number) => number, from: number, to: number, points: number): SpeedTable => {
  const speedsKmPerS = Array.from({ length: points }, (_, i) => from + ((to - from) * i) / (points - 1));
  return { speedsKmPerS, values: speedsKmPerS.map(f) };
};
const maxwell = (v: number): number => v * v * Math.exp(-((v / V0) ** 2));
/** F in the laboratory, −v dη/dv, from the published closed form by differentiation (Lewin & Smith 1996), unnormalised. */
const maxwellInLaboratory = (v: number): number => {
  if (v > V_ESC + V_E) return 0;
  const gauss = (s: number): number =>
    Math.abs(s) < V_ESC ? Math.exp(-((s / V0) ** 2)) : Math.exp(-((V_ESC / V0) ** 2));
  return v * (gauss(v - V_E) - gauss(v + V_E));
};

describe('tabulated standard halo of 2,000 points against the closed form', () => {
  const tables = {
    'F in the galactic frame': tabulatedGalacticHalo(tableOf(maxwell, 0, V_ESC, 2000), V_E),
    'F in the laboratory': tabulatedLaboratoryHalo(tableOf(maxwellInLaboratory, 0, V_ESC + V_E, 2000)),
    η: tabulatedMeanInverseSpeed(tableOf(standard.meanInverseSpeed, 0, V_ESC + V_E, 2000)),
  };
  it.each(Object.entries(tables))('%s: η to 1e-5 of η(0), mean speed and v_max, ∫ η dv = 1', (_, halo) => {
    let compared = 0;
    for (let v = 0; v < V_ESC + V_E; v += 0.73) {
      const off = halo.meanInverseSpeed(v) - standard.meanInverseSpeed(v);
      expect(Math.abs(off / standard.meanInverseSpeed(0)), `${v}`).toBeLessThan(1e-5);
      compared++;
    }
    expect(compared).toBeGreaterThan(1000);
    expect(halo.largestSpeedKmPerS).toBeCloseTo(V_ESC + V_E, 9);
    expect(meanSpeedKmPerS(halo) / 353.731).toBeCloseTo(1, 5);
    expect(tailAt(speedTail(halo, 0), 0)).toBeCloseTo(1, 7);
  });

  it('F in the galactic frame: relative to η itself, too, up to 0.999 v_max', () => {
    const halo = tables['F in the galactic frame'];
    for (let v = 0; v < 0.999 * (V_ESC + V_E); v += 0.73)
      expect(Math.abs(halo.meanInverseSpeed(v) / standard.meanInverseSpeed(v) - 1), `${v}`).toBeLessThan(1e-5);
  });
});

describe('tabulatedGalacticHalo', () => {
  it('is the top-hat of a thin shell: η = (u + V − max(v, |u − V|))/(2uV)', () => {
    for (const [u, V] of [
      [300, 250],
      [100, 250],
    ]) {
      const half = 1e-3;
      const halo = tabulatedGalacticHalo({ speedsKmPerS: [u - half, u, u + half], values: [0, 1, 0] }, V);
      for (const v of [0, 40, 60, 140, 160, 300, 345])
        expect(halo.meanInverseSpeed(v)).toBeCloseTo(
          Math.max(0, u + V - Math.max(v, Math.abs(u - V))) / (2 * u * V),
          8,
        );
    }
  });

  it('tends to the laboratory frame for V → 0, without a break where the forms change', () => {
    const table = tableOf(maxwell, 0, V_ESC, 500);
    const atRest = tabulatedLaboratoryHalo(table);
    for (const V of [0, 9e-6, 1.1e-5, 1e-3]) {
      const halo = tabulatedGalacticHalo(table, V);
      for (const v of [1, 100, 300.3, 540])
        expect(halo.meanInverseSpeed(v) / atRest.meanInverseSpeed(v), `V ${V}, ${v}`).toBeCloseTo(1, 4);
    }
  });

  it('agrees with 10⁶ seeded velocities of a coarse, jagged table within 4 standard errors', () => {
    const table = { speedsKmPerS: [50, 120, 200, 260, 400, 520], values: [1, 4, 2, 6, 3, 0.5] };
    const halo = tabulatedGalacticHalo(table, V_E);
    const random = seededRandom(5);
    const samples = 1_000_000;
    const speeds = [0, 150, 240, 300, 420, 500, 600, 700];
    const [sums, squares] = [new Float64Array(8), new Float64Array(8)];
    for (let n = 0; n < samples; ) {
      const u = 50 + 470 * random();
      const i = table.speedsKmPerS.findIndex((v) => v > u) - 1;
      const [a, b] = [table.speedsKmPerS[i], table.speedsKmPerS[i + 1]];
      const f = table.values[i] + ((table.values[i + 1] - table.values[i]) * (u - a)) / (b - a);
      if (random() * 6 > f) continue;
      n++;
      const cosine = 2 * random() - 1;
      const v = Math.sqrt(u * u + V_E * V_E + 2 * u * V_E * cosine);
      for (let k = 0; k < 8 && v > speeds[k]; k++) {
        sums[k] += 1 / v;
        squares[k] += 1 / v ** 2;
      }
    }
    speeds.forEach((v, k) => {
      const mean = sums[k] / samples;
      const standardError = Math.sqrt((squares[k] / samples - mean * mean) / samples);
      expect(Math.abs(halo.meanInverseSpeed(v) - mean), `${v}`).toBeLessThan(4 * standardError);
    });
    expect(tailAt(speedTail(halo, 0), 0)).toBeCloseTo(1, 7);
  });
});

describe('tabulatedMeanInverseSpeed', () => {
  it('is constant below the first point and falls in a step from a last value above 0: a cold stream', () => {
    const halo = tabulatedMeanInverseSpeed({ speedsKmPerS: [300, 400], values: [2, 2] });
    expect(halo.normalisation).toBe(800);
    for (const v of [0, 300, 399.999]) expect(halo.meanInverseSpeed(v)).toBe(1 / 400);
    expect(halo.meanInverseSpeed(400)).toBe(0);
    expect(tailAt(speedTail(halo, 0), 100)).toBeCloseTo(0.75, 12);
  });
});

describe('tabulated halos: what is reported and refused', () => {
  it('reports the integral of the values as given', () => {
    expect(tabulatedGalacticHalo({ speedsKmPerS: [0, 100, 200], values: [0, 3, 0] }, 250).normalisation).toBe(300);
    expect(tabulatedLaboratoryHalo({ speedsKmPerS: [100, 200], values: [1, 1] }).normalisation).toBe(100);
  });

  it('drops zeros at the end: the largest speed is the last that anything has', () => {
    const table = { speedsKmPerS: [0, 100, 200, 300, 400], values: [0, 3, 0, 0, 0] };
    expect(tabulatedLaboratoryHalo(table).largestSpeedKmPerS).toBe(200);
    expect(tabulatedGalacticHalo(table, 50).largestSpeedKmPerS).toBe(250);
  });

  const speeds = [0, 100, 200];
  const cases: [string, SpeedTable, (string | number)[]][] = [
    ['a negative value', { speedsKmPerS: speeds, values: [0, -1, 1] }, ['values']],
    ['a value that is no number', { speedsKmPerS: speeds, values: [0, Number.NaN, 0] }, ['values']],
    ['nothing at all', { speedsKmPerS: speeds, values: [0, 0, 0] }, ['values']],
    ['an integral beyond all numbers', { speedsKmPerS: speeds, values: [0, 1e308, 1e308] }, ['values']],
    ['a superluminal speed', { speedsKmPerS: [0, 100, SPEED_OF_LIGHT_KM_PER_S], values: [0, 1, 0] }, ['speeds', 2]],
    ['speeds that do not ascend', { speedsKmPerS: [0, 100, 100], values: [0, 1, 0] }, ['speeds', 2]],
    ['a negative speed', { speedsKmPerS: [-1, 100, 200], values: [0, 1, 0] }, ['speeds', 0]],
    ['a single speed', { speedsKmPerS: [1], values: [1] }, ['speeds']],
    ['fewer values than speeds', { speedsKmPerS: speeds, values: [0, 1] }, ['values']],
  ];
  it.each(cases)('all three refuse %s', (_, table, parameter) => {
    for (const make of [
      (t: SpeedTable) => tabulatedGalacticHalo(t, 250),
      tabulatedLaboratoryHalo,
      tabulatedMeanInverseSpeed,
    ])
      expect(() => make(table)).toThrowError(
        expect.objectContaining({ parameter: expect.arrayContaining([parameter[0]]) }),
      );
  });

  it('refuses particles at rest where ⟨1/v⟩ would diverge, an η that rises, a superluminal laboratory', () => {
    const atRest = { speedsKmPerS: speeds, values: [1, 1, 0] };
    for (const make of [(t: SpeedTable) => tabulatedGalacticHalo(t, 250), tabulatedLaboratoryHalo])
      expect(() => make(atRest)).toThrowError(expect.objectContaining({ parameter: ['values', 0] }));
    expect(() => tabulatedMeanInverseSpeed({ speedsKmPerS: speeds, values: [1, 2, 0] })).toThrowError(
      expect.objectContaining({ parameter: ['values', 1] }),
    );
    expect(() => tabulatedGalacticHalo({ speedsKmPerS: speeds, values: [0, 1, 0] }, 3e5)).toThrowError(
      expect.objectContaining({ parameter: ['laboratorySpeed'] }),
    );
  });
});
