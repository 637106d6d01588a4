/** Uploaded tables as files in a directory (crystals/table-files), read and written by the worker pool. */
import type { Compute } from '../compute/compute.ts';
import { type StoredHeader, TABLE_ID, type TableRecord } from './crystal-record.ts';
import type { TableStore } from './table-store.ts';

/** Headers kept in memory, so that a list does not open every file every time. */
const MOST_HEADERS = 10_000;

/** The store in `folder`, which holds one kind of table. */
export function directoryStore<H extends StoredHeader>(folder: string, compute: Compute): TableStore<H> {
  const headers = new Map<string, H>();
  return {
    async get(id) {
      return TABLE_ID.test(id)
        ? ((await compute.run('readTable', { folder, id })) as TableRecord<H> | undefined)
        : undefined;
    },
    async put(record) {
      return compute.run('writeTable', { folder, record });
    },
    async list() {
      const ids = await compute.run('listTables', { folder });
      const missing = ids.filter((id) => !headers.has(id));
      const read = missing.length > 0 ? await compute.run('readHeaders', { folder, ids: missing }) : [];
      if (headers.size + read.length > MOST_HEADERS) headers.clear();
      for (const { id, header } of read) headers.set(id, header as H);
      return ids.flatMap((id) => {
        const header = headers.get(id);
        return header ? [{ id, header }] : [];
      });
    },
    async remove(id) {
      headers.delete(id);
      return TABLE_ID.test(id) ? compute.run('removeTable', { folder, id }) : false;
    },
  };
}
