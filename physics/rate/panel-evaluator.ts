/**
 * The inner loops of the rate integral: over one momentum panel, the energy integral of every segment.
 *
 * At fixed q the energy integral is exact. With H and H₂ the tails of η (halo/speed-tail) and v₁, v₂ the minimum speeds at the
 * ends of a segment,
 *
 *   table constant   ∫ η dE = q [H(v₁) − H(v₂)]
 *   table linear     ∫ (1 − t) η dE = whole − B,   ∫ t η dE = B = q [(H₂(v₁) − H₂(v₂))/(v₂ − v₁) − H(v₂)]
 *
 * and η = 0 beyond v_max divides a segment at the kinematic boundary by itself.
 */
import { SPEED_OF_LIGHT_KM_PER_S } from '../constants.ts';
import type { CrystalTable } from '../crystal/crystal-table.ts';
import { columnsOf, formFactorPerValue } from '../crystal/crystal-table.ts';
import { type SpeedTail, secondTailAt, secondTailInCell, tailAt, tailInCell } from '../halo/speed-tail.ts';
import type { EnergySegments } from './energy-segments.ts';
import type { MomentumPanel } from './momentum-panel.ts';
import { NODES, QUADRATIC_AT } from './momentum-panel.ts';

export interface RateIntegrand {
  readonly table: CrystalTable;
  readonly segments: EnergySegments;
  readonly massEv: number;
  readonly splittingEv: number;
  readonly tail: SpeedTail;
  /** |F_DM(q)|², q in eV. */
  readonly mediator: (qEv: number) => number;
}

/** φ at one node: per segment the energy integrals times F²/q², weighted 1 − t (`lower`) and t (`upper`); constant tables use
 * `lower` for the whole. Segments from `reach` on are out of reach and zero. */
interface NodeIntegrals {
  readonly lower: Float64Array;
  readonly upper: Float64Array;
  reach: number;
}

export interface PanelEvaluator {
  /** After `evaluate`: the five-node result and its difference from the three-node one, per segment. */
  readonly value: Float64Array;
  readonly difference: Float64Array;
  /**
   * Integrates over the panel. Segments, counted from the lowest, that can be reached from all of its nodes, and from any of
   * them: in those between, the integrand begins somewhere inside the panel and is not smooth.
   */
  evaluate(panel: MomentumPanel): { readonly fromAll: number; readonly fromAny: number };
}

export function panelEvaluator(integrand: RateIntegrand): PanelEvaluator {
  const { table, segments, massEv, splittingEv, tail, mediator } = integrand;
  const { cutsEv, count, column, share } = segments;
  const linear = table.axes === 'points';
  const stride = columnsOf(table);
  const conversion = formFactorPerValue(table);
  const value = new Float64Array(count);
  const difference = new Float64Array(count);
  const nodes: NodeIntegrals[] = Array.from({ length: NODES }, () => ({
    lower: new Float64Array(count),
    upper: new Float64Array(linear ? count : 0),
    reach: count,
  }));
  const cutMoments = linear ? new Float64Array(NODES * (count + 1)) : new Float64Array(0);
  let lastNodeEv = Number.NaN;

  function fillNode(q: number, node: NodeIntegrals): void {
    const { lower, upper } = node;
    const perEnergy = SPEED_OF_LIGHT_KM_PER_S / q; // speed, km/s, for each eV given
    const recoil = perEnergy * splittingEv + (SPEED_OF_LIGHT_KM_PER_S * q) / (2 * massEv);
    const factor = (mediator(q) * conversion(q)) / q; // F² |f|²/value q⁻² · q
    const lowest = cutsEv[0] * perEnergy + recoil;
    let section = tail;
    let { cells } = section;
    let scale = perEnergy / section.cellKmPerS; // cells for each eV given
    let offset = (recoil - section.fromKmPerS) / section.cellKmPerS;

    let h = tailAt(tail, lowest);
    let h2 = linear ? secondTailAt(tail, lowest) : 0;
    let s = 0;
    while (s < count && h > 0) {
      let next = cutsEv[s + 1] * scale + offset;
      while (next >= cells && section.top) {
        section = section.top;
        cells = section.cells;
        scale = perEnergy / section.cellKmPerS;
        offset = (recoil - section.fromKmPerS) / section.cellKmPerS;
        next = cutsEv[s + 1] * scale + offset;
      }
      let hNext = 0;
      let h2Next = 0;
      if (next < cells) {
        const i = next | 0;
        const t = next - i;
        hNext = tailInCell(section, i, t);
        if (linear) h2Next = secondTailInCell(section, i, t);
      }
      if (linear) {
        const b = (h2 - h2Next) / ((cutsEv[s + 1] - cutsEv[s]) * perEnergy) - hNext;
        lower[s] = factor * (h - hNext - b);
        upper[s] = factor * b;
      } else {
        lower[s] = factor * (h - hNext);
      }
      s++;
      h = hNext;
      h2 = h2Next;
    }
    lower.fill(0, s, node.reach);
    if (linear) upper.fill(0, s, node.reach);
    node.reach = s;
  }

  const [[a0, a2, a4], [b0, b2, b4]] = QUADRATIC_AT;

  function combineConstant(moments: Float64Array, reach: number): void {
    const [p0, p1, p2, p3, p4] = nodes.map((node) => node.lower);
    for (let s = 0; s < reach; s++) {
      const j = column[s];
      const [f0, f1, f2, f3, f4] = [p0[s], p1[s], p2[s], p3[s], p4[s]];
      const m1 = moments[stride + j];
      const m3 = moments[3 * stride + j];
      value[s] = moments[j] * f0 + m1 * f1 + moments[2 * stride + j] * f2 + m3 * f3 + moments[4 * stride + j] * f4;
      difference[s] = m1 * (f1 - a0 * f0 - a2 * f2 - a4 * f4) + m3 * (f3 - b0 * f0 - b2 * f2 - b4 * f4);
    }
  }

  function combineLinear(moments: Float64Array, reach: number): void {
    for (let k = 0; k < NODES; k++) {
      for (let s = 0; s <= reach; s++) {
        const m = k * stride + column[s];
        cutMoments[k * (count + 1) + s] = moments[m] + share[s] * (moments[m + 1] - moments[m]);
      }
    }
    for (let s = 0; s < reach; s++) {
      let sum = 0;
      for (let k = 0; k < NODES; k++) {
        const m = k * (count + 1) + s;
        sum += cutMoments[m] * nodes[k].lower[s] + cutMoments[m + 1] * nodes[k].upper[s];
      }
      value[s] = sum;
      let off = 0;
      for (const [k, [q0, q2, q4]] of [
        [1, QUADRATIC_AT[0]],
        [3, QUADRATIC_AT[1]],
      ] as const) {
        const m = k * (count + 1) + s;
        off +=
          cutMoments[m] *
          (nodes[k].lower[s] - q0 * nodes[0].lower[s] - q2 * nodes[2].lower[s] - q4 * nodes[4].lower[s]);
        off +=
          cutMoments[m + 1] *
          (nodes[k].upper[s] - q0 * nodes[0].upper[s] - q2 * nodes[2].upper[s] - q4 * nodes[4].upper[s]);
      }
      difference[s] = off;
    }
  }

  return {
    value,
    difference,
    evaluate(panel) {
      if (panel.fromEv === lastNodeEv) [nodes[0], nodes[NODES - 1]] = [nodes[NODES - 1], nodes[0]];
      else fillNode(panel.nodesEv[0], nodes[0]);
      for (let k = 1; k < NODES; k++) fillNode(panel.nodesEv[k], nodes[k]);
      lastNodeEv = panel.toEv;
      const reaches = nodes.map((node) => node.reach);
      const fromAny = Math.max(...reaches);
      if (linear) combineLinear(panel.moments, fromAny);
      else combineConstant(panel.moments, fromAny);
      return { fromAll: Math.min(...reaches), fromAny };
    },
  };
}
