/** A table with fewer cells, whose integrals over cells are those of the table it was made from: runs in a worker thread. */
import { cellsOf, coarserEdges, regridded } from '../../physics/crystal/regrid.ts';
import { type CrystalRecord, contentOf, idOf, tableOf } from '../crystals/crystal-record.ts';
import type { CrystalHeader } from '../schemas/crystal.ts';
import type { CrystalRegrid } from '../schemas/crystal-regrids.ts';

export interface RegridJob {
  readonly record: CrystalRecord;
  readonly cells: CrystalRegrid;
}

/** Bounds of a table's texts, which a fresh one must keep too. */
const LONGEST_NAME = 200;
const LONGEST_SOURCE = 5000;

/** The fresh table; the given one where it has no more cells than asked for. */
export function regridAnswer({ record, cells }: RegridJob): CrystalRecord {
  const { header } = record;
  const given = tableOf(header, record.values);
  const fine = header.axes === 'edges' ? given : cellsOf(given);
  const gap = header.bandGapEv ?? 0;
  const momentumKev = coarser(header.momentumKev, cells.momentumCells, []);
  const energyEv = coarser(header.energyEv, cells.energyCells, gap > 0 ? [gap] : []);
  const isSame = momentumKev.length === header.momentumKev.length && energyEv.length === header.energyEv.length;
  if (isSame && header.axes === 'edges') return record;
  const coarse = regridded(
    fine,
    momentumKev.map((q) => q * 1e3),
    energyEv,
  );
  const values = new Float64Array(new SharedArrayBuffer(8 * coarse.values.length));
  values.set(coarse.values);
  const fresh: CrystalHeader = {
    ...header,
    axes: 'edges',
    momentumKev: [...momentumKev],
    energyEv: [...energyEv],
    ...textsOf(record, momentumKev.length - 1, energyEv.length - 1),
  };
  return { id: idOf(contentOf(fresh, values)), header: fresh, values };
}

function coarser(edges: readonly number[], most: number | undefined, keep: readonly number[]): Float64Array {
  const given = Float64Array.from(edges);
  return most === undefined ? given : coarserEdges(given, most, keep);
}

/** Name and source say what was done, from which table. */
function textsOf({ id, header }: CrystalRecord, rows: number, columns: number): { name: string; source: string } {
  const size = ` (${rows} × ${columns} cells)`;
  const origin = `Regridded to ${rows} × ${columns} cells, integrals over cells conserved, from the table ${id}.`;
  return {
    name: shortened(header.name, LONGEST_NAME - size.length) + size,
    source: header.source === undefined ? origin : shortened(`${origin} ${header.source}`, LONGEST_SOURCE),
  };
}

/** Cut between whole characters: half a surrogate pair has no UTF-8 form. */
function shortened(text: string, most: number): string {
  return text.length <= most ? text : text.slice(0, most).replace(/[\uD800-\uDBFF]$/, '');
}
