/** Puts the service together from its parts and the files it comes with. */
import fs from 'node:fs';
import { createRequire } from 'node:module';
import path from 'node:path';
import { type AppOptions, createApp } from './app.ts';
import { computePool } from './compute/pool.ts';
import type { Config } from './config.ts';
import { type BuiltIn, readCatalogue } from './crystals/built-in.ts';
import { crystalLibrary } from './crystals/crystal-library.ts';
import { directoryStore } from './crystals/directory-store.ts';
import { sweepTemporaries } from './crystals/table-files.ts';
import { sweepUploads } from './crystals/upload/upload-folder.ts';
import type { DocsPage } from './docs-page.ts';
import type { Log } from './log.ts';

/** The folder that holds package.json: the sources' parent, or that of `dist`. */
function packageFolder(from: string): string {
  let folder = from;
  while (!fs.existsSync(path.join(folder, 'package.json'))) folder = path.dirname(folder);
  return folder;
}

function docsPage(): DocsPage {
  const folder = path.dirname(createRequire(import.meta.url).resolve('swagger-ui-dist/package.json'));
  const text = (name: string): string => fs.readFileSync(path.join(folder, name), 'utf8');
  return { style: text('swagger-ui.css'), script: text('swagger-ui-bundle.js') };
}

export interface Service {
  readonly app: ReturnType<typeof createApp>;
  /** From now on not ready; computations in flight go on. */
  drain(): void;
  close(): Promise<void>;
}

export async function startService(config: Config, log: Log): Promise<Service> {
  const root = packageFolder(import.meta.dirname);
  const tables = path.join(root, 'service', 'tables');
  const { version } = JSON.parse(fs.readFileSync(path.join(root, 'package.json'), 'utf8')) as { version: string };
  const folder = path.join(config.dataDir, 'crystals');
  const chargeFolder = path.join(config.dataDir, 'charge-tables');
  const uploadFolder = path.join(config.dataDir, 'uploads');
  for (const stored of [folder, chargeFolder]) sweepTemporaries(stored, Date.now());
  sweepUploads(uploadFolder, Date.now());
  const compute = computePool({ workers: config.workers, queue: config.queue });
  const builtIns: BuiltIn[] = [];
  // one after the other: all at once would overflow a short queue
  for (const entry of readCatalogue(tables)) builtIns.push(await compute.run('loadBuiltIn', { folder: tables, entry }));
  const crystals = crystalLibrary(
    builtIns,
    directoryStore(folder, compute),
    config.tableCacheMib * 2 ** 20,
    (id, error) => log.error({ table: id, err: error }, 'damaged table refused'),
  );
  let ready = true;
  const options: AppOptions = {
    crystals,
    chargeTables: directoryStore(chargeFolder, compute),
    compute,
    version,
    uploadFolder,
    isReady: () => ready,
    log,
    deadlineSeconds: config.deadlineSeconds,
    corsOrigins: config.corsOrigins,
    document: fs.readFileSync(path.join(root, 'openapi', 'openapi.json'), 'utf8'),
    docs: docsPage(),
  };
  return {
    app: createApp(options),
    drain: () => {
      ready = false;
    },
    close: () => compute.close(),
  };
}
