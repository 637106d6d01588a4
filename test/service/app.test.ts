/** What every answer has in common: methods, unknown paths, headers, CORS, the document, and failures that are nobody's fault. */
import { describe, expect, test } from 'vitest';
import { inventedScenario } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();

describe('methods', () => {
  test.each([
    ['GET', '/v1/rates', ['POST']],
    ['HEAD', '/v1/rates', ['POST']],
    ['PUT', '/v1/crystals', ['GET', 'HEAD', 'POST']],
    ['POST', '/v1/crystals/silicon', ['DELETE', 'GET', 'HEAD']],
    ['PATCH', '/v1/crystals/silicon', ['DELETE', 'GET', 'HEAD']],
    ['DELETE', '/v1/crystals/silicon/values', ['GET', 'HEAD']],
    ['GET', '/v1/halo/mean-inverse-speed', ['POST']],
    ['POST', '/healthz', ['GET', 'HEAD']],
    ['DELETE', '/readyz', ['GET', 'HEAD']],
    ['POST', '/openapi.json', ['GET', 'HEAD']],
    ['PUT', '/docs', ['GET', 'HEAD']],
    ['OPTIONS', '/healthz', ['GET', 'HEAD']],
  ])('%s %s: 405 with Allow', async (method, path, allowed) => {
    const response = await app.call(method, path);
    expect(response.headers.get('allow')!.split(', ').sort()).toEqual(allowed);
    if (method === 'HEAD') expect([response.status, await response.text()]).toEqual([405, '']);
    else await problemOf(response, 'method');
  });

  test.each([
    '/healthz',
    '/v1/crystals',
    '/v1/crystals/silicon',
    '/v1/crystals/silicon/values',
    '/openapi.json',
    '/docs',
  ])('HEAD %s: the headers of GET, without a body', async (path) => {
    const [head, get] = [await app.call('HEAD', path), await app.get(path)];
    const headers = (response: Response) => [...response.headers].filter(([name]) => name !== 'x-request-id');
    expect([head.status, headers(head)]).toEqual([get.status, headers(get)]);
    expect([await head.text(), (await get.text()) === '']).toEqual(['', false]);
  });
});

describe('paths', () => {
  test.each([
    '/',
    '/v1',
    '/v1/',
    '/v2/rates',
    '/v1/rates/',
    '/v1/Rates',
    '/v1/crystals/silicon/value',
    '/v1/sweeps',
    '/metrics',
    '/docs/../package.json',
    '/docs/%2e%2e/%2e%2e/package.json',
    '/package.json',
    '/.env',
    '/%',
  ])('GET %s: 404', async (path) => {
    await problemOf(await app.get(path), 'not-found');
  });
});

describe('headers', () => {
  test.each([
    ['GET', '/healthz', 200],
    ['GET', '/v1/nothing', 404],
    ['PUT', '/healthz', 405],
    ['POST', '/v1/rates', 415],
  ])('%s %s: X-Request-Id, its own each time, and nosniff', async (method, path, status) => {
    const answers = [await app.call(method, path), await app.call(method, path)];
    expect(answers.map((answer) => answer.status)).toEqual([status, status]);
    const ids = answers.map((answer) => answer.headers.get('x-request-id'));
    expect(new Set(ids).size).toBe(2);
    for (const id of ids) expect(id).toMatch(/^[\w-]{8,}$/);
    expect(answers[0].headers.get('x-content-type-options')).toBe('nosniff');
  });

  test('GET /healthz: a caller’s request id is kept if it is a plain one', async () => {
    expect((await app.get('/healthz', { 'x-request-id': 'plan-42' })).headers.get('x-request-id')).toBe('plan-42');
    for (const odd of ['a b', '<script>', 'x'.repeat(5000)])
      expect((await app.get('/healthz', { 'x-request-id': odd })).headers.get('x-request-id')).toMatch(/^[\w-]{8,64}$/);
  });
});

describe('CORS', () => {
  const origin = 'https://plots.example.org';
  const open = testApp({ corsOrigins: [origin] });
  const asked = { 'access-control-request-method': 'POST', 'access-control-request-headers': 'content-type' };
  const cors = (response: Response): string[] =>
    [...response.headers.keys()].filter((name) => name.startsWith('access-control-'));

  test('GET /healthz: no CORS header by default, for no origin', async () => {
    expect(cors(await app.get('/healthz', { origin }))).toEqual([]);
    expect(cors(await app.call('OPTIONS', '/v1/rates', undefined, { origin, ...asked }))).toEqual([]);
  });

  test.each([
    ['GET', '/healthz', 200],
    ['GET', '/v1/nothing', 404],
    ['PUT', '/healthz', 405],
    ['POST', '/v1/rates', 415],
    ['DELETE', '/v1/crystals/silicon', 409],
  ])('%s %s: a listed origin may read the answer and its headers', async (method, path, status) => {
    const response = await open.call(method, path, undefined, { origin });
    expect(response.status).toBe(status);
    expect(response.headers.get('access-control-allow-origin')).toBe(origin);
    expect(response.headers.get('access-control-expose-headers')!.split(',').sort()).toEqual(
      ['Location', 'ETag', 'Retry-After', 'Server-Timing', 'X-Request-Id'].sort(),
    );
    expect(response.headers.get('vary')).toMatch(/\borigin\b/i);
  });

  test('GET /v1/crystals/silicon: a 304 keeps them', async () => {
    const response = await open.get('/v1/crystals/silicon', { origin, 'if-none-match': '*' });
    expect(response.status).toBe(304);
    expect(response.headers.get('access-control-allow-origin')).toBe(origin);
  });

  test.each([
    'https://other.example.org',
    'https://plots.example.org.evil.example',
    'http://plots.example.org',
    'null',
  ])('GET /healthz: origin %s is not let in', async (other) => {
    expect((await open.get('/healthz', { origin: other })).headers.get('access-control-allow-origin')).toBeNull();
    const preflight = await open.call('OPTIONS', '/v1/rates', undefined, { origin: other, ...asked });
    expect(preflight.headers.get('access-control-allow-origin')).toBeNull();
  });

  test('OPTIONS /v1/rates: a preflight from a listed origin', async () => {
    const response = await open.call('OPTIONS', '/v1/rates', undefined, { origin, ...asked });
    expect([response.status, await response.text()]).toEqual([204, '']);
    expect(response.headers.get('access-control-allow-origin')).toBe(origin);
    expect(response.headers.get('access-control-allow-methods')!.split(',').sort()).toEqual(
      ['DELETE', 'GET', 'HEAD', 'POST'].sort(),
    );
    expect(response.headers.get('access-control-allow-headers')).toBe('content-type');
  });

  test('GET /healthz: CORS_ORIGINS=* lets everyone in', async () => {
    const response = await testApp({ corsOrigins: ['*'] }).get('/healthz', { origin });
    expect(response.headers.get('access-control-allow-origin')).toBe('*');
  });
});

describe('document', () => {
  test('GET /openapi.json: the text it was given, byte for byte', async () => {
    const response = await app.get('/openapi.json');
    expect(await response.text()).toBe('{"openapi":"3.1.0"}\n');
    expect(response.headers.get('content-type')).toBe('application/json');
  });

  test('GET /docs: a page that may load nothing from elsewhere', async () => {
    const response = await app.get('/docs');
    const page = await response.text();
    expect(response.headers.get('content-type')).toBe('text/html; charset=utf-8');
    expect(response.headers.get('content-security-policy')).toMatch(/default-src 'none'/);
    const links = [...page.matchAll(/(?:src|href)="([^"]*)"/g)].map((match) => match[1]);
    expect(links.length).toBeGreaterThanOrEqual(3);
    for (const link of links.filter((link) => link !== 'data:,')) expect((await app.get(`/${link}`)).status).toBe(200);
  });
});

describe('failures', () => {
  const failing = (error: unknown) =>
    testApp({ compute: { run: () => Promise.reject(error), workers: 1, async close() {} } });

  test('POST /v1/rates: the unknown is a bare 500 to the caller, everything to the log', async () => {
    const broken = failing(new Error('secret in /srv/data'));
    const { detail } = await problemOf(await broken.post('/v1/rates', inventedScenario()), 'internal');
    expect(detail).not.toMatch(/secret|srv/);
    expect(broken.errors).toHaveLength(1);
    expect(String((broken.errors[0] as { err: Error }[])[0].err)).toContain('secret');
  });

  test('POST /v1/rates: past the deadline it is 503 with Retry-After', async () => {
    const late = testApp({
      deadlineSeconds: 0.01,
      compute: {
        run: (_task, _input, options) =>
          new Promise((_resolve, reject) => {
            options!.signal!.addEventListener('abort', () => reject(options!.signal!.reason as Error));
          }),
        workers: 1,
        async close() {},
      },
    });
    const response = await late.post('/v1/rates', inventedScenario());
    expect(response.headers.get('retry-after')).toMatch(/^\d+$/);
    await problemOf(response, 'busy');
    expect(late.errors).toEqual([]);
  });

  test.each(['ENOSPC', 'EROFS', 'EACCES', 'EDQUOT'])(
    'POST /v1/crystals: a disk that answers %s is 507',
    async (code) => {
      const { inventedTable } = await import('../support/invented.ts');
      const { memoryStore } = await import('../support/memory-store.ts');
      const put = () => Promise.reject(Object.assign(new Error(`${code}: /srv/data/x`), { code }));
      const full = testApp({ store: { ...memoryStore(), put } });
      const { detail } = await problemOf(await full.post('/v1/crystals', inventedTable()), 'storage-full');
      expect(detail).not.toContain('srv');
      expect((await full.post('/v1/rates', inventedScenario())).status).toBe(200);
    },
  );
});
