/** Where uploaded tables live. Asynchronous and by hash, so that another kind of store can take the place of a directory. */
import type { StoredHeader, TableRecord } from './crystal-record.ts';

export interface TableStore<H extends StoredHeader> {
  /** The table, checked against its id; undefined if there is none. Rejects with DamagedTableError. */
  get(id: string): Promise<TableRecord<H> | undefined>;
  /** `created` is false if the same table is already there. */
  put(record: TableRecord<H>): Promise<{ readonly created: boolean }>;
  list(): Promise<readonly { readonly id: string; readonly header: H }[]>;
  /** False if there is none. */
  remove(id: string): Promise<boolean>;
}
