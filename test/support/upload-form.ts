/** Forms, .npy and HDF5 files made of invented numbers, whole and broken. */
import type * as H5 from 'h5wasm';
import type { Json } from './invented.ts';
import type { TestApp } from './test-app.ts';

export interface Part {
  readonly name: string;
  readonly content: string | Uint8Array;
  readonly filename?: string;
  readonly type?: string;
}

const BOUNDARY = 'invented-boundary-7d3f';
export const FORM_TYPE = `multipart/form-data; boundary=${BOUNDARY}`;

export function formBytes(parts: readonly Part[]): Buffer {
  const pieces = parts.flatMap(({ name, content, filename, type }) => [
    `--${BOUNDARY}\r\nContent-Disposition: form-data; name="${name}"`,
    filename === undefined ? '' : `; filename="${filename}"`,
    type === undefined ? '' : `\r\nContent-Type: ${type}`,
    '\r\n\r\n',
    content,
    '\r\n',
  ]);
  return Buffer.concat([...pieces, `--${BOUNDARY}--\r\n`].map((piece) => Buffer.from(piece as string)));
}

export function tableForm(description: unknown, values: string | Uint8Array): Buffer {
  const text = typeof description === 'string' ? description : JSON.stringify(description);
  return formBytes([
    { name: 'description', content: text },
    { name: 'values', content: values, filename: 'values' },
  ]);
}

export function postForm(app: TestApp, form: Buffer, headers: Record<string, string> = {}): Promise<Response> {
  return app.post('/v1/crystals', form, { 'content-type': FORM_TYPE, ...headers });
}

export const upload = (app: TestApp, description: unknown, values: string | Uint8Array): Promise<Response> =>
  postForm(app, tableForm(description, values));

/** A table without its values, as the description part has it. */
export function withoutValues({ formFactorSquared: _form, lossFunction: _loss, ...rest }: Json): Json {
  return rest;
}

/** An .npy file around any header and any bytes. */
export function npyAround(header: string, data: Uint8Array, version = 1): Buffer {
  const length = Buffer.alloc(version === 1 ? 2 : 4);
  if (version === 1) length.writeUInt16LE(header.length);
  else length.writeUInt32LE(header.length);
  return Buffer.concat([Buffer.from([0x93, ...Buffer.from('NUMPY'), version, 0]), length, Buffer.from(header), data]);
}

export function npyHeader(shape: string, descr = "'<f8'", order = 'False'): string {
  return `{'descr': ${descr}, 'fortran_order': ${order}, 'shape': ${shape}, }\n`;
}

/** Rows of numbers as .npy of little-endian float64. */
export function npyOf(rows: readonly (readonly number[])[]): Buffer {
  const numbers = Float64Array.from(rows.flat());
  return npyAround(npyHeader(`(${rows.length}, ${rows[0].length})`), new Uint8Array(numbers.buffer));
}

let made = 0;

/** An HDF5 file as the library writes it. */
export async function hdf5Of(fill: (file: H5.File) => void): Promise<Uint8Array> {
  const h5 = await import('h5wasm');
  const { FS } = await h5.ready;
  const path = `/made-${made++}.h5`;
  const file = new h5.File(path, 'w', { libver: ['earliest', 'latest'] });
  fill(file);
  file.close();
  const bytes = Uint8Array.from(FS.readFile(path));
  FS.unlink(path);
  return bytes;
}
