import { describe, expect, test } from 'vitest';
import { inventedScenario, inventedTable } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

describe('GET /healthz and /readyz', () => {
  test.each(['/healthz', '/readyz'])('GET %s: ok, not to be kept', async (path) => {
    const response = await testApp().get(path);
    expect([response.status, await response.text()]).toEqual([200, '{"status":"ok"}']);
    expect(response.headers.get('cache-control')).toBe('no-store');
  });

  test('GET /readyz: 503 with Retry-After while shutting down; alive all the same, and no new work', async () => {
    const app = testApp({ isReady: () => false });
    const response = await app.get('/readyz');
    expect(response.headers.get('retry-after')).toMatch(/^\d+$/);
    await problemOf(response, 'busy');
    expect((await app.get('/healthz')).status).toBe(200);
    await problemOf(await app.post('/v1/rates', inventedScenario()), 'busy');
    await problemOf(await app.post('/v1/crystals', inventedTable()), 'busy');
    expect((await app.get('/v1/crystals')).status).toBe(200);
  });
});
