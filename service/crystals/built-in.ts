/**
 * The crystal tables that come with the service: read-only, each with its provenance and stated accuracy. `tables/catalogue.json`
 * lists them; `tables/README.md` says how they were computed, `tables/recipe` holds the programs. Runs in a worker thread.
 */
import fs from 'node:fs';
import path from 'node:path';
import { parse as parseNpy } from 'npyjs';
import { CrystalTableIn } from '../schemas/crystal.ts';
import { type CrystalRecord, DamagedTableError } from './crystal-record.ts';
import type { PackedMatrix } from './matrix.ts';

export interface BuiltIn {
  readonly alias: string;
  readonly accuracy: readonly string[];
  readonly record: CrystalRecord;
}

export interface CatalogueEntry {
  readonly alias: string;
  readonly id: string;
  /** A table without its values, and the file of its values. */
  readonly description: string;
  readonly values: string;
  readonly screened: boolean;
  readonly accuracy: readonly string[];
}

export function readCatalogue(folder: string): CatalogueEntry[] {
  return JSON.parse(fs.readFileSync(path.join(folder, 'catalogue.json'), 'utf8')) as CatalogueEntry[];
}

/** Loads one entry; throws DamagedTableError unless it has the id that the catalogue gives. */
export function loadBuiltIn(folder: string, entry: CatalogueEntry): BuiltIn {
  const file = fs.readFileSync(path.join(folder, entry.values));
  const npy = parseNpy(file.buffer.slice(file.byteOffset, file.byteOffset + file.byteLength) as ArrayBuffer);
  const [rows, columns] = npy.shape;
  const values = new Float64Array(new SharedArrayBuffer(8 * rows * columns));
  values.set(npy.data as Float32Array);
  const matrix: PackedMatrix = {
    packed: true,
    rowLengths: new Int32Array(rows).fill(columns),
    values,
    faults: [],
    faultCount: 0,
  };
  const description = JSON.parse(fs.readFileSync(path.join(folder, entry.description), 'utf8')) as object;
  const { id, header } = CrystalTableIn.parse({ ...description, screened: entry.screened, formFactorSquared: matrix });
  if (id !== entry.id)
    throw new DamagedTableError(`built-in table ${entry.alias} has id ${id}, its catalogue says ${entry.id}`);
  return { alias: entry.alias, accuracy: entry.accuracy, record: { id, header, values } };
}
