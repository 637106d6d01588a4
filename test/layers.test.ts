/** The house rules that a reader of the tree relies on: who may import whom, and what lies where. */
import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, test } from 'vitest';

const root = fileURLToPath(new URL('..', import.meta.url));
const committed = execFileSync('git', ['ls-files'], { cwd: root, encoding: 'utf8' }).trim().split('\n');

/** In order: each may import itself and those before it. */
const LAYERS = ['physics', 'service', 'openapi', 'test'];
/** The one door of the calculation to Node: mathjs is loaded as CommonJS, in a tenth of the time. */
const PHYSICS_EXCEPTION = { file: 'physics/quantity/quantity.ts', line: "import { createRequire } from 'node:module'" };
const NUMERICAL = /^(?:mathjs(?:\/.*)?|@stdlib\/.*)$/;

interface ImportLine {
  readonly file: string;
  readonly line: string;
  readonly target: string;
}

const sources = LAYERS.flatMap((layer) =>
  fs
    .readdirSync(path.join(root, layer), { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith('.ts'))
    .map((name) => `${layer}/${name}`),
);

/** Static imports, re-exports, `import(…)` and the argument of a `createRequire(…)(…)`, one entry each. */
const imports: ImportLine[] = sources.flatMap((file) =>
  [
    ...fs
      .readFileSync(path.join(root, file), 'utf8')
      .matchAll(
        /^(?:(?:import|export)\b[^;'"]*?\bfrom|import)\s*['"]([^'"]+)['"]|\bimport\(\s*['"]([^'"]+)['"]\s*\)|\brequire\(\s*['"]([^'"]+)['"]\s*\)|createRequire\([^)]*\)\(\s*['"]([^'"]+)['"]/gm,
      ),
  ].map((match) => ({ file, line: match[0], target: match.slice(1).find((text) => text !== undefined)! })),
);

const layerOf = (file: string): number => LAYERS.indexOf(file.split('/')[0]);
const fileOf = ({ file, target }: ImportLine): string => path.posix.join(path.posix.dirname(file), target);
const shown = ({ file, target }: ImportLine): string => `${file} imports ${target}`;

describe('layers', () => {
  test('imports: enough of them are read for the rules to mean something', () => {
    expect(imports.filter(({ file }) => file.startsWith('physics/')).length).toBeGreaterThan(20);
    expect(imports.filter(({ file }) => file.startsWith('service/')).length).toBeGreaterThan(60);
    expect(imports.map(({ line }) => line)).toContain(PHYSICS_EXCEPTION.line);
    expect(imports.map(({ target }) => target)).toContain('mathjs/lib/browser/math.js');
  });

  test('imports: physics ← service ← openapi ← test, one direction only', () => {
    const relative = imports.filter(({ target }) => target.startsWith('.'));
    const offences = relative.filter((found) => !(layerOf(fileOf(found)) <= layerOf(found.file)));
    expect(offences.map(shown)).toEqual([]);
    const outside = relative.filter((found) => layerOf(fileOf(found)) < 0 && fileOf(found) !== 'package.json');
    expect(outside.map(shown)).toEqual([]);
  });

  test('imports: physics takes nothing but itself and numerical packages', () => {
    const offences = imports.filter(
      ({ file, line, target }) =>
        file.startsWith('physics/') &&
        !target.startsWith('.') &&
        !NUMERICAL.test(target) &&
        !(file === PHYSICS_EXCEPTION.file && line === PHYSICS_EXCEPTION.line),
    );
    expect(offences.map(shown)).toEqual([]);
  });

  test('imports: physics reaches for nothing of the world by a global name', () => {
    const offences = sources
      .filter((file) => file.startsWith('physics/'))
      .filter((file) =>
        /\b(?:process\.|console\.|fetch\(|Date\.now|new Date|performance\.|setTimeout|Math\.random)/.test(
          fs.readFileSync(path.join(root, file), 'utf8').replaceAll(/\/\*[\s\S]*?\*\/|\/\/.*/g, ''),
        ),
      );
    expect(offences).toEqual([]);
  });
});

describe('tree', () => {
  test('top level: the rooms of the house and what tools insist on', () => {
    const needed = ['service', 'physics', 'test', 'openapi', 'docker', 'package.json', 'README.md', 'DEVELOPERS.md'];
    const ofTools = ['package-lock.json', 'tsconfig.json', 'biome.json', '.gitignore', '.ci'];
    const ofToolsPerhaps = ['knip.json', 'LICENSE', '.dockerignore'];
    const found = [...new Set(committed.map((file) => file.split('/')[0]))];
    expect(found.filter((name) => !ofToolsPerhaps.includes(name)).sort()).toEqual([...needed, ...ofTools].sort());
  });

  test('names: none that says nothing', () => {
    const offences = committed.filter((file) =>
      /(?:^|\/)(?:utils?|helpers?|common|misc|types)(?:\.[^/]*)?(?:\/|$)/i.test(file),
    );
    expect(offences).toEqual([]);
  });
});
