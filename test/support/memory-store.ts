/** Uploaded tables in memory. */
import type { StoredHeader, TableRecord } from '../../service/crystals/crystal-record.ts';
import type { TableStore } from '../../service/crystals/table-store.ts';

export function memoryStore<H extends StoredHeader>(): TableStore<H> {
  const tables = new Map<string, TableRecord<H>>();
  return {
    async get(id) {
      return tables.get(id);
    },
    async put(record) {
      const created = !tables.has(record.id);
      tables.set(record.id, record);
      return { created };
    },
    async list() {
      return [...tables.values()];
    },
    async remove(id) {
      return tables.delete(id);
    },
  };
}
