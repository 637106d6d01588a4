/**
 * One table object for each table a thread has seen. Every job brings a fresh object around the same shared values; what the
 * calculation remembers of a table (its momentum panels) hangs on the object. A screened twin is computed once a thread, from
 * the table as given, and kept beside it.
 */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { screenedTwin } from '../../physics/crystal/dielectric.ts';
import { type GivenTable, lossTable } from '../crystals/given-table.ts';
import { kept } from './kept.ts';
import type { ResolvedCrystal } from './resolved-scenario.ts';

const MOST_TABLES = 16;
/** A twin has values of its own in every thread: fewer of them. */
const MOST_TWINS = 4;
const tables = new Map<string, CrystalTable>(); // least recently used first
const twins = new Map<string, CrystalTable>();

/** The table that a scenario's rates are made of: `table` as it was given, its screened twin, or either half of a dielectric function. */
export function keptTable({ id, screened, twin, electronsPerCell }: ResolvedCrystal, table: GivenTable): CrystalTable {
  const { realDielectric } = table;
  if (realDielectric && screened) return kept(twins, MOST_TWINS, id, () => lossTable(table, realDielectric));
  const given = kept(tables, MOST_TABLES, id, () => table);
  return twin === 'used' ? kept(twins, MOST_TWINS, id, () => screenedTwin(given, electronsPerCell)) : given;
}
