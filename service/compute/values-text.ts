/** A whole table as JSON text, in the form in which it can be posted: runs in a worker thread. */
import { shapeOf } from '../crystals/crystal-record.ts';
import type { CrystalHeader } from '../schemas/crystal.ts';

export interface ValuesJob {
  readonly header: CrystalHeader;
  readonly values: Float64Array;
}

export function valuesText({ header, values }: ValuesJob): Uint8Array {
  const { rows, columns } = shapeOf(header);
  const quantity = (value: number | undefined, unit: string): string | undefined =>
    value === undefined ? undefined : `${value} ${unit}`;
  const body = {
    name: header.name,
    source: header.source,
    screened: header.screened,
    cellMass: quantity(header.cellMassGev, 'GeV'),
    cellVolume: quantity(header.cellVolumeAngstrom3, 'angstrom^3'),
    electronsPerCell: header.electronsPerCell,
    bandGap: quantity(header.bandGapEv, 'eV'),
    energyPerPair: quantity(header.energyPerPairEv, 'eV'),
    momentum: { unit: 'keV', [header.axes]: header.momentumKev },
    energy: { unit: 'eV', [header.axes]: header.energyEv },
    [header.quantity]: Array.from({ length: rows }, (_, i) =>
      Array.from(values.subarray(i * columns, (i + 1) * columns)),
    ),
  };
  return new TextEncoder().encode(JSON.stringify(body));
}
