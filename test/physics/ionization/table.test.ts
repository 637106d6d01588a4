import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { tableFaults, tableIonization } from '../../../physics/ionization/table.ts';

const TABLE = {
  energiesEv: [1.12, 4.92, 8.72],
  probabilities: [
    [1, 0],
    [0.25, 0.7],
    [0, 0.5],
  ],
  bandGapEv: 1.12,
};

function weights(energyEv: number, count = 2): number[] {
  const out = new Float64Array(count).fill(-1);
  tableIonization(TABLE).probabilities(energyEv, out);
  return [...out];
}

describe('tableIonization', () => {
  it('is the rows, and linear between them', () => {
    expect(weights(1.12)).toEqual([1, 0]);
    expect(weights(4.92)).toEqual([0.25, 0.7]);
    expect(weights(8.72)).toEqual([0, 0.5]);
    expect(weights(3.02)[0]).toBeCloseTo(0.625, 14);
    expect(weights(3.02)[1]).toBeCloseTo(0.35, 14);
  });

  it('frees nothing below the gap, off the axis, and above its columns', () => {
    expect(weights(1.119)).toEqual([0, 0]);
    expect(weights(8.721)).toEqual([0, 0]);
    expect(weights(5, 4).slice(2)).toEqual([0, 0]);
    expect(weights(4.92, 1)).toEqual([0.25]);
  });

  it('lostFraction: what a row lacks of 1, all of it off the axis, none below the gap', () => {
    const model = tableIonization(TABLE);
    expect(model.lostFraction(1)).toBe(0);
    expect(model.lostFraction(1.12)).toBe(0);
    expect(model.lostFraction(4.92)).toBeCloseTo(0.05, 14);
    expect(model.lostFraction(6.82)).toBeCloseTo(0.275, 14);
    expect(model.lostFraction(9)).toBe(1);
    expect(tableIonization({ ...TABLE, bandGapEv: 0.5 }).lostFraction(0.8)).toBe(1);
  });

  it('probabilities and lost fraction add up to 1', () => {
    const model = tableIonization(TABLE);
    fc.assert(
      fc.property(fc.double({ min: 1.12, max: 12, noNaN: true }), (energy) => {
        expect(weights(energy, 5).reduce((a, b) => a + b, model.lostFraction(energy))).toBeCloseTo(1, 14);
      }),
      { seed: 1 },
    );
  });

  it('breaks and middles give bin rates within 2e-5 for a falling spectrum, against the integral by parts', () => {
    const model = tableIonization(TABLE);
    const scaleEv = 3.8;
    const { energiesEv, probabilities } = TABLE;
    const cuts = [1.12, ...model.breaksEv(1.12, 20), 20];
    expect(cuts.length).toBeLessThan(400);
    const rates = [0, 0];
    const out = new Float64Array(2);
    for (let s = 1; s < cuts.length; s++) {
      model.probabilities((cuts[s - 1] + cuts[s]) / 2, out);
      const rate = scaleEv * (Math.exp(-cuts[s - 1] / scaleEv) - Math.exp(-cuts[s] / scaleEv));
      for (const n of [0, 1]) rates[n] += out[n] * rate;
    }
    // ∫ (p + p′(E − a)) e^{−E/L} dE over [a, b] = L (p_a e^{−a/L} − p_b e^{−b/L}) + p′ L² (e^{−a/L} − e^{−b/L})
    for (const n of [0, 1]) {
      let exact = 0;
      for (let i = 1; i < energiesEv.length; i++) {
        const [a, b] = [Math.exp(-energiesEv[i - 1] / scaleEv), Math.exp(-energiesEv[i] / scaleEv)];
        const slope = (probabilities[i][n] - probabilities[i - 1][n]) / (energiesEv[i] - energiesEv[i - 1]);
        exact += scaleEv * (probabilities[i - 1][n] * a - probabilities[i][n] * b) + slope * scaleEv ** 2 * (a - b);
      }
      expect(Math.abs(rates[n] / exact - 1)).toBeLessThan(2e-5);
    }
  });

  it('does not divide where nothing changes, and stays bounded where almost all is lost', () => {
    const constant = { energiesEv: [1, 1000], probabilities: [[0.5], [0.5]], bandGapEv: 1 };
    expect(tableIonization(constant).breaksEv(0, 2000)).toEqual([1, 1000]);
    const lost = { energiesEv: [1, 1000, 2000], probabilities: [[0], [1e-12], [0]], bandGapEv: 1 };
    expect(tableIonization(lost).breaksEv(0, 3000).length).toBeLessThan(20_010);
  });
});

describe('tableFaults', () => {
  const paths = (table: Partial<typeof TABLE>): string[] =>
    tableFaults({ ...TABLE, ...table }).map((fault) => `/${fault.path.join('/')}`);

  it('finds none in a good table; a sum may pass 1 by rounding', () => {
    expect(paths({})).toEqual([]);
    expect(
      paths({
        probabilities: [
          [1, 5e-10],
          [0.25, 0.7],
          [0, 0.5],
        ],
      }),
    ).toEqual([]);
  });

  it.each([
    [{ bandGapEv: -1 }, ['/bandGap']],
    [{ bandGapEv: 2 }, ['/probabilities/0']],
    [{ energiesEv: [1.12, 1.12, 8] }, ['/energies/1']],
    [{ energiesEv: [1.12, Number.NaN, 8] }, ['/energies/1']],
    [{ energiesEv: [1.12, 4.92] }, ['/probabilities']],
    [{ energiesEv: [1.12], probabilities: [[1]] }, ['/energies']],
    [{ energiesEv: [], probabilities: [] }, ['/energies']],
    [{ probabilities: [[], [], []] }, ['/probabilities/0', '/probabilities/1', '/probabilities/2']],
    [
      {
        probabilities: [
          [1, 0],
          [0.3, 0.7, 0],
          [0.6, 0.5],
        ],
      },
      ['/probabilities/1', '/probabilities/2'],
    ],
    [
      {
        probabilities: [
          [1, -0.1],
          [Infinity, 0.7],
          [0, Number.NaN],
        ],
      },
      ['/probabilities/0/1', '/probabilities/1/0', '/probabilities/2/1'],
    ],
    [
      {
        bandGapEv: Infinity,
        energiesEv: [3, 2, 1],
        probabilities: [
          [0, 0],
          [0.9, 0.9],
          [0, 0],
        ],
      },
      ['/bandGap', '/energies/1', '/energies/2', '/probabilities/1', '/probabilities/1'],
    ],
  ])('%j: every fault, with its path', (change, expected) => {
    expect(paths(change)).toEqual(expected);
  });

  it('tableIonization refuses what has a fault', () => {
    expect(() => tableIonization({ ...TABLE, bandGapEv: -1 })).toThrow(DomainError);
  });
});
