import { describe, expect, it } from 'vitest';
import { columnsOf } from '../../../physics/crystal/crystal-table.ts';
import { momentumPanel, NODES, panelBoundariesEv } from '../../../physics/rate/momentum-panel.ts';
import { referenceTable } from '../../support/reference-table.ts';

describe('momentumPanel', () => {
  it('has moments that sum to the table’s own integral over the panel, constant and linear', () => {
    for (const name of ['T1', 'T2', 'T6', 'T7']) {
      const table = referenceTable(name);
      const axis = table.momentumEv;
      const columns = columnsOf(table);
      const value = (i: number, j: number): number => table.values[i * columns + j];
      for (const [a, b] of [
        [axis[0], axis[axis.length - 1]],
        [axis[1] * 1.01, axis[1] * 1.02],
        [axis[2] * 0.97, axis[5] * 1.001],
      ]) {
        const { moments } = momentumPanel(table, a, b);
        for (const j of [0, 3, columns - 1]) {
          let expected = 0;
          for (let i = 0; i + 1 < axis.length; i++) {
            const [from, to] = [Math.max(a, axis[i]), Math.min(b, axis[i + 1])];
            if (!(to > from)) continue;
            const share = ((from + to) / 2 - axis[i]) / (axis[i + 1] - axis[i]);
            expected +=
              (to - from) *
              (table.axes === 'edges' ? value(i, j) : (1 - share) * value(i, j) + share * value(i + 1, j));
          }
          const sum = Array.from({ length: NODES }, (_, k) => moments[k * columns + j]).reduce((x, y) => x + y, 0);
          expect(sum / expected, `${name} [${a}, ${b}] column ${j}`).toBeCloseTo(1, 11);
        }
      }
    }
  });

  it('divides a range at the same lattice for every table: neighbours 7 % apart, ends as given', () => {
    const inner = panelBoundariesEv(1000, 2000);
    const outer = panelBoundariesEv(500, 70_000);
    expect(inner[0]).toBe(1000);
    expect(inner.at(-1)).toBe(2000);
    for (const q of inner.slice(1, -1)) expect(outer).toContain(q);
    for (let i = 1; i < outer.length; i++) expect(outer[i] / outer[i - 1]).toBeLessThan(1.0701);
  });
});
