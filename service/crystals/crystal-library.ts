/**
 * Every table the service can compute with: built-in ones by id or alias, uploaded ones by id. Tables in use stay in memory on
 * shared buffers, the least recently used leave first.
 */

import type { z } from 'zod';
import { Problem } from '../problem.ts';
import type { CrystalDescription, CrystalHeader } from '../schemas/crystal.ts';
import type { BuiltIn } from './built-in.ts';
import { type CrystalRecord, DamagedTableError } from './crystal-record.ts';
import type { TableStore } from './table-store.ts';

export interface CrystalLibrary {
  /** By id or alias; undefined if there is none. Throws a Problem for a damaged one. */
  find(name: string): Promise<CrystalRecord | undefined>;
  describe(name: string): Promise<z.output<typeof CrystalDescription> | undefined>;
  list(): Promise<z.output<typeof CrystalDescription>[]>;
  /** `created` is false if the same table is already there. */
  add(record: CrystalRecord): Promise<{ readonly created: boolean }>;
  /** False if there is none; throws a Problem for a built-in or a table in use. */
  remove(name: string): Promise<boolean>;
  isAlias(name: string): boolean;
  /** Runs `work` while the table counts as in use. */
  using<T>(id: string, work: () => Promise<T>): Promise<T>;
}

export function crystalLibrary(
  builtIns: readonly BuiltIn[],
  store: TableStore<CrystalHeader>,
  cacheBytes: number,
  onDamaged: (id: string, error: DamagedTableError) => void,
): CrystalLibrary {
  const aliases = new Map(builtIns.map((table) => [table.alias, table.record.id]));
  const byId = new Map(builtIns.map((table) => [table.record.id, table]));
  const cache = new Map<string, CrystalRecord>(); // least recently used first
  const inUse = new Map<string, number>();

  const keep = (record: CrystalRecord): void => {
    cache.delete(record.id);
    cache.set(record.id, record);
    let bytes = [...cache.values()].reduce((sum, { values }) => sum + values.byteLength, 0);
    for (const [id, { values }] of cache) {
      if (bytes <= cacheBytes || id === record.id) break;
      cache.delete(id);
      bytes -= values.byteLength;
    }
  };

  const find = async (name: string): Promise<CrystalRecord | undefined> => {
    const id = aliases.get(name) ?? name;
    const known = byId.get(id)?.record ?? cache.get(id);
    if (known) {
      if (cache.has(id)) keep(known);
      return known;
    }
    try {
      const record = await store.get(id);
      if (record) keep(record);
      return record;
    } catch (error) {
      if (!(error instanceof DamagedTableError)) throw error;
      onDamaged(id, error);
      throw new Problem('internal', `The stored table ${id} is damaged and was not used; upload it again.`);
    }
  };

  const describe = (id: string, header: CrystalHeader): z.output<typeof CrystalDescription> => {
    const builtIn = byId.get(id);
    const axis = (unit: string, values: readonly number[]) => ({
      unit,
      kind: header.axes,
      count: values.length,
      from: values[0],
      to: values[values.length - 1],
    });
    return {
      id,
      aliases: builtIn ? [builtIn.alias] : [],
      builtIn: builtIn !== undefined,
      name: header.name,
      ...(header.source === undefined ? {} : { source: header.source }),
      ...(builtIn ? { accuracy: [...builtIn.accuracy] } : {}),
      quantity: header.quantity,
      screened: header.screened,
      cellMass: { value: header.cellMassGev, unit: 'GeV' },
      ...(header.cellVolumeAngstrom3 === undefined
        ? {}
        : { cellVolume: { value: header.cellVolumeAngstrom3, unit: 'angstrom^3' as const } }),
      ...(header.electronsPerCell === undefined ? {} : { electronsPerCell: header.electronsPerCell }),
      ...(header.bandGapEv === undefined ? {} : { bandGap: { value: header.bandGapEv, unit: 'eV' as const } }),
      ...(header.energyPerPairEv === undefined
        ? {}
        : { energyPerPair: { value: header.energyPerPairEv, unit: 'eV' as const } }),
      momentum: axis('keV', header.momentumKev),
      energy: axis('eV', header.energyEv),
      links: { self: `/v1/crystals/${id}`, values: `/v1/crystals/${id}/values` },
    };
  };

  return {
    find,
    isAlias: (name) => aliases.has(name),
    async describe(name) {
      const record = await find(name);
      return record && describe(record.id, record.header);
    },
    async list() {
      const stored = (await store.list())
        // a damaged file may hold a line of JSON that is no header; it is refused when it is loaded
        .filter(
          ({ id, header }) => !byId.has(id) && Array.isArray(header.momentumKev) && Array.isArray(header.energyEv),
        )
        .sort((a, b) => compare(a.header.name, b.header.name) || compare(a.id, b.id));
      return [...builtIns.map(({ record }) => record), ...stored].map(({ id, header }) => describe(id, header));
    },
    async add(record) {
      if (byId.has(record.id)) return { created: false };
      const stored = await store.put(record);
      keep(record); // what was stored a moment ago is not read back
      return stored;
    },
    async remove(name) {
      const id = aliases.get(name) ?? name;
      if (byId.has(id)) throw new Problem('in-use', 'A built-in table cannot be deleted.');
      if ((inUse.get(id) ?? 0) > 0)
        throw new Problem('in-use', 'The table is in use by a computation; try again when it is done.');
      const removed = await store.remove(id);
      cache.delete(id);
      return removed;
    },
    async using(id, work) {
      inUse.set(id, (inUse.get(id) ?? 0) + 1);
      try {
        return await work();
      } finally {
        const users = (inUse.get(id) ?? 1) - 1;
        if (users > 0) inUse.set(id, users);
        else inUse.delete(id);
      }
    },
  };
}

const compare = (a: string, b: string): number => (a < b ? -1 : a > b ? 1 : 0);
