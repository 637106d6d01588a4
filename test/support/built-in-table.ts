/** The built-in tables as the calculation takes them. */
import { fileURLToPath } from 'node:url';
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { loadBuiltIn, readCatalogue } from '../../service/crystals/built-in.ts';
import { tableOf } from '../../service/crystals/crystal-record.ts';

export const TABLES_FOLDER = fileURLToPath(new URL('../../service/tables', import.meta.url));

export function builtInTable(
  crystal: string,
  screened: boolean,
): { table: CrystalTable; bandGapEv: number; energyPerPairEv: number } {
  const entry = readCatalogue(TABLES_FOLDER).find(
    ({ alias }) => alias === (screened ? crystal : `${crystal}-unscreened`),
  );
  if (!entry) throw new Error(`no built-in table ${crystal}`);
  const { header, values } = loadBuiltIn(TABLES_FOLDER, entry).record;
  return { table: tableOf(header, values), bandGapEv: header.bandGapEv!, energyPerPairEv: header.energyPerPairEv! };
}
