/** The application with every built-in table; `testApp` alone has silicon's. */
import { loadBuiltIn, readCatalogue } from '../../service/crystals/built-in.ts';
import { crystalLibrary } from '../../service/crystals/crystal-library.ts';
import { TABLES_FOLDER } from './built-in-table.ts';
import { memoryStore } from './memory-store.ts';
import { type TestApp, testApp } from './test-app.ts';

export function appWithAllBuiltIns(): TestApp {
  const builtIns = readCatalogue(TABLES_FOLDER).map((entry) => loadBuiltIn(TABLES_FOLDER, entry));
  return testApp({ crystals: crystalLibrary(builtIns, memoryStore(), 2 ** 28, () => undefined) });
}
