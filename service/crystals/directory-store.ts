/** Uploaded tables as files in a directory (crystals/table-files), read and written by the worker pool. */
import type { Compute } from '../compute/compute.ts';
import type { CrystalHeader } from '../schemas/crystal.ts';
import { CRYSTAL_ID } from './crystal-record.ts';
import type { CrystalStore } from './crystal-store.ts';

/** Headers kept in memory, so that a list does not open every file every time. */
const MOST_HEADERS = 10_000;

export function directoryStore(folder: string, compute: Compute): CrystalStore {
  const headers = new Map<string, CrystalHeader>();
  return {
    async get(id) {
      return CRYSTAL_ID.test(id) ? compute.run('readTable', { folder, id }) : undefined;
    },
    async put(record) {
      return compute.run('writeTable', { folder, record });
    },
    async list() {
      const ids = await compute.run('listTables', { folder });
      const missing = ids.filter((id) => !headers.has(id));
      const read = missing.length > 0 ? await compute.run('readHeaders', { folder, ids: missing }) : [];
      if (headers.size + read.length > MOST_HEADERS) headers.clear();
      for (const { id, header } of read) headers.set(id, header);
      const fresh = new Map(read.map(({ id, header }) => [id, header]));
      return ids.flatMap((id) => {
        const header = headers.get(id) ?? fresh.get(id);
        return header ? [{ id, header }] : [];
      });
    },
    async remove(id) {
      return CRYSTAL_ID.test(id) ? compute.run('removeTable', { folder, id }) : false;
    },
  };
}
