/** From a validated scenario to one that can be computed: its tables found, the gap and pair energy settled, or every fault told. */
import type { CrystalTable } from '../physics/crystal/crystal-table.ts';
import { tableFaults } from '../physics/ionization/table.ts';
import type { ResolvedCrystal, ResolvedScenario } from './compute/resolved-scenario.ts';
import { tableOf } from './crystals/crystal-record.ts';
import { type Fault, invalidInput, pointerOf } from './problem.ts';
import type { Dependencies } from './route.ts';
import { type ChargeTable, chargeTablePath } from './schemas/charge-table.ts';
import type { CrystalHeader } from './schemas/crystal.ts';
import type { CrystalIn, ScenarioIn } from './schemas/scenario.ts';

type Tables = Pick<Dependencies, 'crystals' | 'chargeTables'>;

interface FoundCrystal {
  readonly id: string;
  readonly header: CrystalHeader;
  readonly values: Float64Array;
  readonly inline: boolean;
}

export function unknownCrystal(pointer: string, id: string): Fault {
  return { pointer, detail: `no table has the id or alias "${id}"; GET /v1/crystals lists them` };
}

/** The table a scenario names or brings; undefined with a fault where the name is unknown. */
async function findCrystal(
  crystal: CrystalIn,
  tables: Tables,
  faults: Fault[],
  at: string,
): Promise<FoundCrystal | undefined> {
  if ('header' in crystal) return { ...crystal, inline: true };
  const record = await tables.crystals.find(crystal.id);
  if (!record) faults.push(unknownCrystal(`${at}/id`, crystal.id));
  return record && { ...record, inline: false };
}

async function findChargeTable(input: ScenarioIn, tables: Tables, faults: Fault[]): Promise<ChargeTable | undefined> {
  const { table } = input.ionization;
  if (table === undefined || !('id' in table)) return table;
  const record = await tables.chargeTables.get(table.id);
  if (!record)
    faults.push({
      pointer: '/ionization/table/id',
      detail: `no charge table has the id "${table.id}"; GET /v1/charge-tables lists them`,
    });
  return record && { energiesEv: record.header.energiesEv, probabilities: record.header.probabilities };
}

/** Settles the screening: never another table than the one named, and a screened twin only where it is asked for. */
async function screenedAs(
  { screening }: ScenarioIn,
  { id, header, inline }: FoundCrystal,
  tables: Tables,
  faults: Fault[],
  crystalAt: string,
): Promise<ResolvedCrystal> {
  const { electronsPerCell } = header;
  if (header.quantity === 'dielectricFunction') {
    return { id, screened: screening !== 'none', twin: 'none', electronsPerCell };
  }
  if (header.screened) {
    if (screening === 'none') faults.push({ pointer: '/screening', detail: await whyScreened(id, header, tables) });
    return { id, screened: true, twin: 'none', electronsPerCell };
  }
  const hasVolume = header.cellVolumeAngstrom3 !== undefined;
  if (screening !== 'in-medium') return { id, screened: false, twin: hasVolume ? 'offered' : 'none', electronsPerCell };
  if (!hasVolume) {
    const detail =
      'the table is unscreened and gives no cell volume, without which its dielectric function, and so its screening, cannot be computed';
    faults.push({ pointer: inline ? `${crystalAt}/cellVolume` : '/screening', detail });
  }
  return { id, screened: true, twin: 'used', electronsPerCell };
}

/** Why screening cannot be taken out, and the built-in table to name instead if there is one. */
async function whyScreened(id: string, { quantity }: CrystalHeader, { crystals }: Tables): Promise<string> {
  const why =
    quantity === 'lossFunction'
      ? 'the table holds a loss function, which is screened by nature'
      : 'the numbers of the table include in-medium screening, which cannot be taken out of them';
  const names = (await crystals.describe(id))?.aliases.map((alias) => `${alias}-unscreened`) ?? [];
  const known = names.find((name) => crystals.isAlias(name));
  return known === undefined ? `${why}; name an unscreened table` : `${why}; the table "${known}" has none`;
}

export interface ScenarioToCompute {
  readonly scenario: ResolvedScenario;
  readonly table: CrystalTable;
}

/** `at` is where in the body the scenario stands, a pointer, and `crystalAt` its table in it; faults are told from there. */
export async function resolveScenario(
  input: ScenarioIn,
  tables: Tables,
  at = '',
  crystalAt = '/crystal',
): Promise<ScenarioToCompute> {
  const faults: Fault[] = [];
  const refuse = (): never => {
    throw invalidInput(faults.map((fault) => ({ ...fault, pointer: at + (fault.pointer ?? '') })));
  };
  const crystal = await findCrystal(input.crystal, tables, faults, crystalAt);
  const chargeTable = await findChargeTable(input, tables, faults);
  if (!crystal) return refuse();
  const { header } = crystal;
  const bandGapEv = input.ionization.bandGapEv ?? header.bandGapEv;
  const energyPerPairEv = input.ionization.energyPerPairEv ?? header.energyPerPairEv;
  const missing = (field: string, what: string): void => {
    faults.push({ pointer: `/ionization/${field}`, detail: `is needed: the table does not give ${what}` });
  };
  if (bandGapEv === undefined) missing('bandGap', 'a band gap');
  if (energyPerPairEv === undefined) missing('energyPerPair', 'an energy per pair');
  if (bandGapEv === undefined || energyPerPairEv === undefined) return refuse();
  if (energyPerPairEv < bandGapEv) {
    const detail = `must be at least the band gap: ${energyPerPairEv} eV is below ${bandGapEv} eV`;
    faults.push({ pointer: '/ionization/energyPerPair', detail });
  }
  const splitting = input.darkMatter.massSplittingEv;
  if (splitting < 0 && splitting <= -bandGapEv) {
    faults.push({ pointer: '/darkMatter/massSplitting', detail: `must be above minus the band gap, ${-bandGapEv} eV` });
  } else if (header.momentumKev[0] === 0 && !(Math.max(bandGapEv, header.energyEv[0]) + splitting > 0)) {
    const detail =
      'the momentum axis begins at 0, where energy plus mass splitting can vanish: give a band gap, or a table that begins above 0';
    faults.push({ pointer: crystal.inline ? `${crystalAt}/momentum` : `${crystalAt}/id`, detail });
  }
  if (chargeTable) {
    for (const { path, detail } of tableFaults({ ...chargeTable, bandGapEv })) {
      faults.push({ pointer: pointerOf(['ionization', 'table', ...chargeTablePath(path)]), detail });
    }
  }
  const resolved = await screenedAs(input, crystal, tables, faults, crystalAt);
  if (faults.length > 0) return refuse();
  return {
    scenario: {
      ...input,
      crystal: resolved,
      ionization: { ...input.ionization, bandGapEv, energyPerPairEv, table: chargeTable },
    },
    table: tableOf(header, crystal.values),
  };
}
