/**
 * One table object for each table a thread has seen. Every job brings a fresh object around the same shared values; what the
 * calculation remembers of a table (its momentum panels) hangs on the object.
 */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';

const MOST_TABLES = 16;
const tables = new Map<string, CrystalTable>(); // least recently used first

export function keptTable(id: string, table: CrystalTable): CrystalTable {
  const kept = tables.get(id) ?? table;
  tables.delete(id);
  tables.set(id, kept);
  if (tables.size > MOST_TABLES) tables.delete(tables.keys().next().value!);
  return kept;
}
