/** From a validated scenario to one that can be computed: its table found, the gap and pair energy settled, or every fault told. */
import type { CrystalTable } from '../physics/crystal/crystal-table.ts';
import type { ResolvedScenario } from './compute/rates-answer.ts';
import type { CrystalLibrary } from './crystals/crystal-library.ts';
import { tableOf } from './crystals/crystal-record.ts';
import { type Fault, invalidInput } from './problem.ts';
import type { CrystalHeader } from './schemas/crystal.ts';
import type { CrystalIn, ScenarioIn } from './schemas/scenario.ts';

interface FoundCrystal {
  readonly id: string;
  readonly header: CrystalHeader;
  readonly values: Float64Array;
  readonly inline: boolean;
}

/** The table a scenario names or brings; undefined with a fault where the name is unknown. */
async function findCrystal(
  crystal: CrystalIn,
  library: CrystalLibrary,
  faults: Fault[],
): Promise<FoundCrystal | undefined> {
  if ('header' in crystal) return { ...crystal, inline: true };
  const record = await library.find(crystal.id);
  if (!record)
    faults.push({
      pointer: '/crystal/id',
      detail: `no table has the id or alias "${crystal.id}"; GET /v1/crystals lists them`,
    });
  return record && { ...record, inline: false };
}

export async function resolveScenario(
  input: ScenarioIn,
  library: CrystalLibrary,
): Promise<{ readonly scenario: ResolvedScenario; readonly table: CrystalTable }> {
  const faults: Fault[] = [];
  const crystal = await findCrystal(input.crystal, library, faults);
  if (!crystal) throw invalidInput(faults);
  const { header } = crystal;
  const bandGapEv = input.ionization.bandGapEv ?? header.bandGapEv;
  const energyPerPairEv = input.ionization.energyPerPairEv ?? header.energyPerPairEv;
  const missing = (field: string, what: string): void => {
    faults.push({ pointer: `/ionization/${field}`, detail: `is needed: the table does not give ${what}` });
  };
  if (bandGapEv === undefined) missing('bandGap', 'a band gap');
  if (energyPerPairEv === undefined) missing('energyPerPair', 'an energy per pair');
  if (bandGapEv === undefined || energyPerPairEv === undefined) throw invalidInput(faults);
  if (energyPerPairEv < bandGapEv) {
    faults.push({
      pointer: '/ionization/energyPerPair',
      detail: `must be at least the band gap: ${energyPerPairEv} eV is below ${bandGapEv} eV`,
    });
  }
  const splitting = input.darkMatter.massSplittingEv;
  if (splitting < 0 && splitting <= -bandGapEv) {
    faults.push({ pointer: '/darkMatter/massSplitting', detail: `must be above minus the band gap, ${-bandGapEv} eV` });
  } else if (header.momentumKev[0] === 0 && !(Math.max(bandGapEv, header.energyEv[0]) + splitting > 0)) {
    const detail =
      'the momentum axis begins at 0, where energy plus mass splitting can vanish: give a band gap, or a table that begins above 0';
    faults.push({ pointer: crystal.inline ? '/crystal/momentum' : '/crystal/id', detail });
  }
  if (faults.length > 0) throw invalidInput(faults);
  return {
    scenario: {
      ...input,
      crystal: { id: crystal.id, screened: header.screened },
      ionization: { ...input.ionization, bandGapEv, energyPerPairEv },
    },
    table: tableOf(header, crystal.values),
  };
}
