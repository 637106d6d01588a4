/** The application in this process: no port, no threads, no files but the built-in silicon tables. */
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { type AppOptions, createApp } from '../../service/app.ts';
import { loadBuiltIn, readCatalogue } from '../../service/crystals/built-in.ts';
import { crystalLibrary } from '../../service/crystals/crystal-library.ts';
import type { TableStore } from '../../service/crystals/table-store.ts';
import type { CrystalHeader } from '../../service/schemas/crystal.ts';
import { inProcessCompute } from './in-process-compute.ts';
import { memoryStore } from './memory-store.ts';

export interface TestAppOptions extends Partial<AppOptions> {
  readonly store?: TableStore<CrystalHeader>;
}

export interface TestApp {
  /** The answer to a request; a body that is no string or bytes is sent as JSON. */
  call(method: string, path: string, body?: unknown, headers?: Record<string, string>): Promise<Response>;
  get(path: string, headers?: Record<string, string>): Promise<Response>;
  post(path: string, body: unknown, headers?: Record<string, string>): Promise<Response>;
  /** What was logged as an error. */
  readonly errors: unknown[];
}

const tables = fileURLToPath(new URL('../../service/tables', import.meta.url));
/** Where uploads lie while they are read: nothing stays there. */
export const UPLOADS = path.join(os.tmpdir(), `gramyear-test-uploads-${process.pid}-${process.hrtime.bigint()}`);
process.on('exit', () => fs.rmSync(UPLOADS, { recursive: true, force: true }));
const builtIns = readCatalogue(tables)
  .filter(({ alias }) => alias.startsWith('silicon'))
  .map((entry) => loadBuiltIn(tables, entry));

export function testApp({ store = memoryStore(), ...options }: TestAppOptions = {}): TestApp {
  const errors: unknown[] = [];
  const log = { info() {}, warn() {}, fatal() {}, error: (...facts: unknown[]) => errors.push(facts) };
  const app = createApp({
    crystals: crystalLibrary(builtIns, store, 2 ** 28, (id) => errors.push(id)),
    chargeTables: memoryStore(),
    compute: inProcessCompute(),
    version: '1.2.3',
    uploadFolder: UPLOADS,
    isReady: () => true,
    log: log as unknown as AppOptions['log'],
    deadlineSeconds: 60,
    corsOrigins: [],
    document: '{"openapi":"3.1.0"}\n',
    docs: { style: '/* style */', script: '/* script */' },
    ...options,
  });
  const call: TestApp['call'] = async (method, path, body, headers = {}) =>
    app.request(path, {
      method,
      headers: body === undefined ? headers : { 'content-type': 'application/json', ...headers },
      ...(body === undefined ? {} : { body: rawOrJson(body) }),
    });
  return {
    call,
    get: (path, headers) => call('GET', path, undefined, headers),
    post: (path, body, headers) => call('POST', path, body, headers),
    errors,
  };
}

function rawOrJson(body: unknown): string | Uint8Array<ArrayBuffer> {
  if (typeof body === 'string') return body;
  return body instanceof Uint8Array ? new Uint8Array(body) : JSON.stringify(body);
}
