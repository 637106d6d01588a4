/** The OpenAPI document: current, valid, and true of the service. */
import { execFileSync } from 'node:child_process';
import fs from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { Validator } from '@seriousme/openapi-schema-validator';
import { describe, expect, test } from 'vitest';
import { documentText } from '../../openapi/document.ts';
import { ROUTES } from '../../service/routes/index.ts';
import { BODIES } from '../../service/schemas/bodies.ts';
import { problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const root = fileURLToPath(new URL('../..', import.meta.url));
const text = (file: string): string => fs.readFileSync(path.join(root, file), 'utf8');
const committed = text('openapi/openapi.json');
const { version } = JSON.parse(text('package.json')) as { version: string };

interface Operation {
  readonly operationId: string;
  readonly parameters?: readonly { readonly name: string; readonly example?: string }[];
  readonly requestBody?: {
    readonly content: Record<string, { readonly examples?: Record<string, { readonly value: unknown }> }>;
  };
  readonly responses: Record<string, { readonly content?: Record<string, unknown> }>;
}
const document = JSON.parse(committed) as { readonly paths: Record<string, Record<string, Operation>> };
const operations = Object.entries(document.paths).flatMap(([where, item]) =>
  Object.entries(item).map(([method, operation]) => ({ where, method, operation })),
);

function refsIn(value: unknown): string[] {
  if (typeof value !== 'object' || value === null) return [];
  return Object.entries(value).flatMap(([key, inner]) => (key === '$ref' ? [String(inner)] : refsIn(inner)));
}

describe('openapi.json', () => {
  test('openapi.json: is what the routes make of it (npm run openapi)', () => {
    expect(committed).toBe(documentText(version));
  });

  test('openapi.json: is valid OpenAPI 3.1', async () => {
    const validator = new Validator();
    const result = await validator.validate(JSON.parse(committed) as Record<string, unknown>);
    expect(result).toEqual({ valid: true });
    expect(validator.version).toBe('3.1');
  });

  test('openapi.json: passes the recommended lint rules without a warning', () => {
    const output = execFileSync(
      process.execPath,
      [
        path.join(root, 'node_modules/@redocly/cli/bin/cli.js'),
        'lint',
        path.join(root, 'openapi/openapi.json'),
        '--config',
        path.join(root, 'openapi/redocly.yaml'),
        '--format=json',
      ],
      {
        encoding: 'utf8',
        stdio: ['ignore', 'pipe', 'ignore'],
        env: { ...process.env, REDOCLY_TELEMETRY: 'off', REDOCLY_SUPPRESS_UPDATE_NOTICE: 'true' },
      },
    );
    const { totals, problems } = JSON.parse(output.slice(output.indexOf('{'))) as {
      totals: object;
      problems: unknown[];
    };
    expect(problems).toEqual([]);
    expect(totals).toMatchObject({ errors: 0, warnings: 0 });
  });

  test('openapi.json: every $ref leads somewhere', () => {
    const refs = [...new Set(refsIn(document))];
    expect(refs.length).toBeGreaterThan(20);
    for (const ref of refs) {
      const keys = ref.replace(/^#\//, '').split('/');
      const found = keys.reduce<unknown>((at, key) => (at as Record<string, unknown> | undefined)?.[key], document);
      expect(found, ref).toBeTypeOf('object');
    }
  });

  test('openapi.json: has every route once, and every problem a route can answer', () => {
    expect(operations.map(({ where, method }) => `${method} ${where}`)).toEqual(
      expect.arrayContaining(ROUTES.map(({ path: where, method }) => `${method} ${where}`)),
    );
    expect(operations).toHaveLength(ROUTES.length);
    expect(new Set(operations.map(({ operation }) => operation.operationId)).size).toBe(ROUTES.length);
    for (const { operation } of operations.filter(({ method }) => method === 'post')) {
      expect(Object.keys(operation.responses)).toEqual(expect.arrayContaining(['400', '413', '415', '422', '503']));
      expect(Object.keys(operation.requestBody!.content['application/json'].examples ?? {}).length).toBeGreaterThan(0);
    }
  });
});

describe('examples', () => {
  const examples = operations.flatMap(({ where, method, operation }) =>
    Object.entries(operation.requestBody?.content['application/json'].examples ?? {}).map(
      ([name, { value }]) => [`${method.toUpperCase()} ${where}`, name, value] as const,
    ),
  );
  const app = testApp();
  /** The path with the examples of its parameters. */
  const filled = (where: string): string =>
    (document.paths[where]['post'].parameters ?? []).reduce(
      (at, { name, example }) => at.replace(`{${name}}`, example ?? ''),
      where,
    );

  test.each(examples)('%s: example "%s" is answered as documented', async (call, _name, value) => {
    const [method, where] = call.split(' ');
    const route = ROUTES.find((each) => each.path === where && each.method === method.toLowerCase())!;
    const response = await app.call(method, filled(where), value);
    expect([200, 201]).toContain(response.status);
    const documented = route.responses[response.status];
    expect(response.headers.get('content-type')).toBe(documented.mediaType ?? 'application/json');
    const checked = documented.schema!.safeParse(await response.json());
    expect(checked.error?.issues).toBeUndefined();
  });

  test('POST: an unknown field in an example is refused, so its schema is closed', async () => {
    for (const [call, , value] of examples) {
      const [method, where] = call.split(' ');
      const response = await app.call(method, where, { ...(value as object), unheardOf: 1 });
      const { errors } = await problemOf(response, 'invalid-input');
      expect(errors!.map(({ pointer }) => pointer)).toContain('/unheardOf');
    }
    expect(examples.length).toBeGreaterThanOrEqual(Object.keys(BODIES).length);
  });
});
