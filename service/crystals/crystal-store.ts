/** Where uploaded tables live. Asynchronous and by hash, so that another kind of store can take the place of a directory. */
import type { CrystalHeader } from '../schemas/crystal.ts';
import type { CrystalRecord } from './crystal-record.ts';

export interface StoredCrystal {
  readonly id: string;
  readonly header: CrystalHeader;
}

export interface CrystalStore {
  /** The table, checked against its id; undefined if there is none. Rejects with DamagedTableError. */
  get(id: string): Promise<CrystalRecord | undefined>;
  /** `created` is false if the same table is already there. */
  put(record: CrystalRecord): Promise<{ readonly created: boolean }>;
  list(): Promise<readonly StoredCrystal[]>;
  /** False if there is none. */
  remove(id: string): Promise<boolean>;
}
