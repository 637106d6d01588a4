/** The tables of fixtures/rates.json as the calculation takes them. */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import reference from '../fixtures/rates.json' with { type: 'json' };

interface TableJson {
  readonly momentum: { readonly edges?: number[]; readonly points?: number[] };
  readonly energy: { readonly edges?: number[]; readonly points?: number[] };
  readonly formFactorSquared?: number[][];
  readonly lossFunction?: number[][];
}

const tables = new Map<string, CrystalTable>();

export function referenceTable(name: string): CrystalTable {
  const known = tables.get(name);
  if (known) return known;
  const json = (reference.tables as Record<string, TableJson>)[name];
  const axes = json.momentum.edges ? 'edges' : 'points';
  const table: CrystalTable = {
    axes,
    quantity: json.formFactorSquared ? 'formFactorSquared' : 'lossFunction',
    momentumEv: Float64Array.from(json.momentum[axes] ?? [], (q) => q * 1e3),
    energyEv: Float64Array.from(json.energy[axes] ?? []),
    values: Float64Array.from((json.formFactorSquared ?? json.lossFunction ?? []).flat()),
    cellMassEv: 52.32e9,
    cellVolumeAngstrom3: 40,
  };
  tables.set(name, table);
  return table;
}
