/**
 * The energy axis of a rate integral: the table's energies at and above the gap, cut further wherever a bin begins or an
 * ionization weight jumps. Within a segment the table is constant (edges) or linear (points), and so the energy integral is
 * exact.
 */
import type { CrystalTable } from '../crystal/crystal-table.ts';
import { intervalOf } from '../numeric/interval.ts';

export interface EnergySegments {
  /** Ends of the segments, eV, ascending; one more than there are segments. May be empty: nothing in the table above the gap. */
  readonly cutsEv: Float64Array;
  readonly count: number;
  /** Table column of each cut: for edges that of the segment above it, for points that of the sample at or below it. */
  readonly column: Int32Array;
  /** Position of each cut between two samples, 0…1 (points only). */
  readonly share: Float64Array;
}

/** Segments from fromEv to the table's last energy; cuts at extraCutsEv and no segment wider than maxSegmentEv. */
export function energySegments(
  table: CrystalTable,
  fromEv: number,
  extraCutsEv: readonly number[],
  maxSegmentEv: number,
): EnergySegments {
  const axis = table.energyEv;
  const last = axis[axis.length - 1];
  const start = Math.max(fromEv, axis[0]);
  if (!(start < last))
    return { cutsEv: new Float64Array(0), count: 0, column: new Int32Array(0), share: new Float64Array(0) };
  const inside = [...axis, ...extraCutsEv].filter((e) => e > start && e < last);
  const coarse = [start, ...inside.sort((a, b) => a - b), last].filter((e, i, all) => i === 0 || e > all[i - 1]);
  const cuts = [start];
  for (let i = 1; i < coarse.length; i++) {
    const pieces = Math.max(1, Math.ceil((coarse[i] - coarse[i - 1]) / maxSegmentEv - 1e-9));
    for (let p = 1; p < pieces; p++) cuts.push(coarse[i - 1] + ((coarse[i] - coarse[i - 1]) * p) / pieces);
    cuts.push(coarse[i]);
  }
  const column = Int32Array.from(cuts, (e) => intervalOf(axis, e));
  const share = Float64Array.from(cuts, (e, i) => (e - axis[column[i]]) / (axis[column[i] + 1] - axis[column[i]]));
  return { cutsEv: Float64Array.from(cuts), count: cuts.length - 1, column, share };
}
