import { describe, expect, it } from 'vitest';
import type { Json } from '../support/invented.ts';
import { pointersOf, problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const table: Json = {
  name: 'Invented',
  energies: { unit: 'eV', values: [1.2, 5] },
  probabilities: [
    [1, 0],
    [0.25, 0.5],
  ],
};

describe('/v1/charge-tables', () => {
  it('POST stores once, GET gives it back whole, the list names it, DELETE forgets it', async () => {
    const app = testApp();
    const first = await app.post('/v1/charge-tables', table);
    expect(first.status).toBe(201);
    const stored = (await first.json()) as Json;
    expect(stored).toMatchObject({
      name: 'Invented',
      energies: { unit: 'eV', values: [1.2, 5] },
      probabilities: [
        [1, 0],
        [0.25, 0.5],
      ],
    });
    expect(first.headers.get('location')).toBe(`/v1/charge-tables/${stored['id']}`);
    const inKev = { ...table, energies: { unit: 'meV', values: [1200, 5000] } };
    const again = await app.post('/v1/charge-tables', inKev);
    expect([again.status, ((await again.json()) as Json)['id']]).toEqual([200, stored['id']]);
    const whole = await app.get(`/v1/charge-tables/${stored['id']}`);
    expect(await whole.json()).toEqual(stored);
    expect(whole.headers.get('etag')).toBe(`"${stored['id']}"`);
    expect(await (await app.get('/v1/charge-tables')).json()).toEqual({
      chargeTables: [{ id: stored['id'], name: 'Invented' }],
    });
    expect((await app.call('DELETE', `/v1/charge-tables/${stored['id']}`)).status).toBe(204);
    await problemOf(await app.get(`/v1/charge-tables/${stored['id']}`), 'not-found');
    await problemOf(await app.call('DELETE', `/v1/charge-tables/${stored['id']}`), 'not-found');
  });

  it.each([
    [
      {
        probabilities: [
          [1, 0.1],
          [1, 0],
        ],
      },
      ['/probabilities/0'],
    ],
    [{ probabilities: [[1], [0.5, 0.5]] }, ['/probabilities/1']],
    [{ probabilities: [[1]] }, ['/probabilities']],
    [{ energies: { unit: 'eV', values: [5, 5] } }, ['/energies/values/1']],
    [{ energies: { unit: 'kg', values: [1, 5] } }, ['/energies/unit']],
    [{ name: '', other: 1 }, ['/name', '/other']],
  ])('POST %j: told where', async (over, expected) => {
    expect([...(await pointersOf(await testApp().post('/v1/charge-tables', { ...table, ...over })))].sort()).toEqual(
      [...expected].sort(),
    );
  });
});
