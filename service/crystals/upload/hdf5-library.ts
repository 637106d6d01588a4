/**
 * The HDF5 library with one file open. It sees a file system of its own with nothing in it but that file: HDF5 has external
 * links and external storage, through which an upload could otherwise reach any file of this machine.
 */
import fs from 'node:fs';
import type * as H5 from 'h5wasm';
import type { OpenFile } from './file-blocks.ts';

export type Hdf5Library = Awaited<typeof H5.ready>;

interface FileSystem {
  createFile(parent: string, name: string, properties: object, canRead: boolean, canWrite: boolean): FileNode;
}

interface FileNode {
  usedBytes: number;
  stream_ops: object;
}

const NAME = 'upload';

export interface OpenHdf5 {
  readonly file: H5.File;
  readonly library: Hdf5Library;
  readonly h5: typeof H5;
}

/** The file, read-only; undefined where it is not HDF5. It is never closed: the thread that reads it ends with it. */
export async function openHdf5({ descriptor, size }: OpenFile): Promise<OpenHdf5 | undefined> {
  const h5 = await import('h5wasm');
  const library = await h5.ready;
  const node = (library.FS as unknown as FileSystem).createFile('/', NAME, {}, true, false);
  node.usedBytes = size;
  node.stream_ops = {
    ...node.stream_ops,
    read: (_stream: unknown, buffer: Uint8Array, offset: number, length: number, position: number) =>
      fs.readSync(descriptor, buffer, offset, length, position),
  };
  const file = new h5.File(`/${NAME}`, 'r');
  return file.file_id >= 0n ? { file, library, h5 } : undefined; // a bad file does not throw
}
