/** In-medium screening of a scenario. The twin itself: test/physics/crystal/dielectric.test.ts. */
import { describe, expect, test } from 'vitest';
import { RatesAnswer } from '../../service/schemas/rates.ts';
import { TradeOffsAnswer } from '../../service/schemas/trade-offs.ts';
import { appWithAllBuiltIns } from '../support/all-built-ins.ts';
import { inventedScenario, inventedTable, type Json } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';

const app = appWithAllBuiltIns();

function scenarioOf(id: string, screening: string | undefined, mediator = 'heavy', mass = '10 MeV'): Json {
  return {
    darkMatter: { mass, referenceCrossSection: '1e-37 cm^2', mediator },
    crystal: { id },
    ionization: { maxElectrons: 12 },
    ...(screening === undefined ? {} : { screening }),
  };
}

async function ratesOf(body: unknown): Promise<RatesAnswer> {
  const response = await app.post('/v1/rates', body);
  const text = await response.text();
  expect(response.status, text.slice(0, 300)).toBe(200);
  return RatesAnswer.parse(JSON.parse(text));
}

const codesOf = ({ notices }: Pick<RatesAnswer, 'notices'>) => notices.map(({ code }) => code);
const noticeOf = ({ notices }: RatesAnswer, code: string) => notices.find((notice) => notice.code === code)?.detail;

describe('POST /v1/rates: screening', () => {
  // measured for the twin: bins within 4 %, totals within 4 % (diamond)
  test.each(['silicon', 'germanium', 'diamond', 'gallium-arsenide'])(
    'POST /v1/rates: %s-unscreened "in-medium" is labelled and within 4 % of the shipped screened table',
    async (crystal) => {
      for (const mediator of ['heavy', 'light']) {
        const twin = await ratesOf(scenarioOf(`${crystal}-unscreened`, 'in-medium', mediator));
        const shipped = await ratesOf(scenarioOf(crystal, 'as-given', mediator));
        const bare = await ratesOf(scenarioOf(`${crystal}-unscreened`, 'as-given', mediator));
        let compared = 0;
        twin.bins.forEach(({ rate }, n) => {
          if (rate.value < 1e-4 * twin.total.value) return;
          expect(Math.abs(rate.value / shipped.bins[n].rate.value - 1), `${mediator} ${n + 1}`).toBeLessThan(0.04);
          compared++;
        });
        expect(compared).toBeGreaterThan(1);
        expect(bare.total.value).toBeGreaterThan(1.1 * twin.total.value);
        expect(codesOf(twin)).toContain('screened-twin');
        expect(codesOf(twin)).not.toContain('unscreened-table');
        expect(noticeOf(twin, 'screened-twin')).toMatch(/Kramers–Kronig.*f-sum rule.*one pole.*at most 4 %/);
      }
    },
  );

  test('POST /v1/rates: the table is the one that was named, whatever the screening, and the hash tells them apart', async () => {
    const answers: RatesAnswer[] = [];
    for (const screening of [undefined, 'as-given', 'none', 'in-medium'])
      answers.push(await ratesOf(scenarioOf('silicon-unscreened', screening)));
    const ids = answers.map(({ provenance }) => provenance.crystal!.id);
    expect(new Set(ids).size).toBe(1);
    const hashes = answers.map(({ provenance }) => provenance.request.sha256);
    expect(hashes[0]).toBe(hashes[1]);
    expect(new Set(hashes).size).toBe(3);
  });

  test('POST /v1/rates: "in-medium" then "as-given" then "in-medium" again: neither takes the other’s place', async () => {
    const ask = async (screening: string) =>
      (await app.post('/v1/rates', scenarioOf('diamond-unscreened', screening))).text();
    const first = [await ask('in-medium'), await ask('as-given')];
    expect([await ask('in-medium'), await ask('as-given')]).toEqual(first);
    expect(first[0]).not.toBe(first[1]);
  });

  test('POST /v1/rates: "none" on an unscreened table and "in-medium" on a screened one are as given', async () => {
    const withoutHash = async (id: string, screening: string) => {
      const { provenance: _, ...rest } = await ratesOf(scenarioOf(id, screening));
      return rest;
    };
    for (const [id, screening] of [
      ['silicon-unscreened', 'none'],
      ['silicon', 'in-medium'],
    ])
      expect(await withoutHash(id, screening)).toEqual(await withoutHash(id, 'as-given'));
  });

  test('POST /v1/rates: "none" on a screened table is refused, with the unscreened table to name instead', async () => {
    const { errors } = await problemOf(await app.post('/v1/rates', scenarioOf('silicon', 'none')), 'invalid-input');
    expect(errors).toEqual([
      {
        pointer: '/screening',
        detail:
          'the numbers of the table include in-medium screening, which cannot be taken out of them; the table "silicon-unscreened" has none',
      },
    ]);
    const { id } = (await (await app.get('/v1/crystals/germanium')).json()) as { id: string };
    const byId = await problemOf(await app.post('/v1/rates', scenarioOf(id, 'none')), 'invalid-input');
    expect(byId.errors![0].detail).toContain('"germanium-unscreened"');
    const inline = inventedScenario({ crystal: inventedTable({ screened: true }), screening: 'none' });
    const own = await problemOf(await app.post('/v1/rates', inline), 'invalid-input');
    expect(own.errors![0]).toMatchObject({
      pointer: '/screening',
      detail: expect.stringContaining('name an unscreened'),
    });
  });

  test('POST /v1/rates: "none" on a loss function says that it is screened by nature', async () => {
    const { formFactorSquared: lossFunction, ...rest } = inventedTable({ cellVolume: '40 angstrom^3' });
    const scenario = inventedScenario({ crystal: { ...rest, lossFunction }, screening: 'none' });
    const { errors } = await problemOf(await app.post('/v1/rates', scenario), 'invalid-input');
    expect(errors![0].detail).toMatch(/loss function, which is screened by nature/);
  });

  test('POST /v1/rates: "in-medium" needs the cell’s volume, and the notice offers it only where there is one', async () => {
    const inline = inventedScenario({ screening: 'in-medium' });
    const { errors } = await problemOf(await app.post('/v1/rates', inline), 'invalid-input');
    expect(errors!.map(({ pointer }) => pointer)).toEqual(['/crystal/cellVolume']);
    const stored = (await (await app.post('/v1/crystals', inventedTable())).json()) as { id: string };
    const byId = { ...inline, crystal: { id: stored.id } };
    const refused = await problemOf(await app.post('/v1/rates', byId), 'invalid-input');
    expect(refused.errors!.map(({ pointer }) => pointer)).toEqual(['/screening']);
    expect(noticeOf(await ratesOf(inventedScenario()), 'unscreened-table')).not.toContain('in-medium"');
    const offered = await ratesOf(scenarioOf('silicon-unscreened', undefined));
    expect(noticeOf(offered, 'unscreened-table')).toContain('"screening": "in-medium"');
  });

  test('POST /v1/rates: without electronsPerCell the twin says that nothing stands for what lies above the table', async () => {
    const crystal = inventedTable({ cellVolume: '40 angstrom^3' });
    const twin = await ratesOf(inventedScenario({ crystal, screening: 'in-medium' }));
    expect(noticeOf(twin, 'screened-twin')).toMatch(/gives no electronsPerCell/);
    const known = inventedTable({ cellVolume: '40 angstrom^3', electronsPerCell: 8 });
    const other = await ratesOf(inventedScenario({ crystal: known, screening: 'in-medium' }));
    expect(noticeOf(other, 'screened-twin')).toMatch(/one pole/);
  });

  test.each([['screened'], [''], [true], [null]])('POST /v1/rates: screening %j is refused', async (screening) => {
    const response = await app.post('/v1/rates', inventedScenario({ screening }));
    const { errors } = await problemOf(response, 'invalid-input');
    expect(errors!.map(({ pointer }) => pointer)).toEqual(['/screening']);
  });
});

describe('POST /v1/trade-offs: screening', () => {
  test('POST /v1/trade-offs: a screened twin needs the larger exposure, and "none" is refused where it is asked', async () => {
    const ask = (id: string, screening: string) =>
      app.post('/v1/trade-offs', {
        scenario: { ...scenarioOf(id, screening), goal: { kind: 'events', count: 3 } },
        windowFrom: [2],
      });
    const neededOf = async (screening: string) => {
      const answer = TradeOffsAnswer.parse(await (await ask('silicon-unscreened', screening)).json());
      return { needed: answer.cheapest!.exposure.needed!.value, codes: codesOf(answer) };
    };
    const [twin, bare] = [await neededOf('in-medium'), await neededOf('none')];
    expect(twin.needed).toBeGreaterThan(1.1 * bare.needed);
    expect(twin.codes).toContain('screened-twin');
    const { errors } = await problemOf(await ask('silicon', 'none'), 'invalid-input');
    expect(errors!.map(({ pointer }) => pointer)).toEqual(['/scenario/screening']);
  });
});

describe('POST /v1/reach: screening', () => {
  test('POST /v1/reach: a screened twin tests less, and "none" is refused where it is asked', async () => {
    const { darkMatter: _, ...rest } = scenarioOf('silicon-unscreened', undefined);
    const ask = (id: string, screening: string) =>
      app.post('/v1/reach', {
        scenario: {
          ...rest,
          darkMatter: { mediator: 'heavy' },
          crystal: { id },
          screening,
          goal: { kind: 'events', count: 3 },
        },
        exposure: '1 kg yr',
        masses: { unit: 'MeV', values: [10] },
      });
    const reachOf = async (screening: string) =>
      (await (await ask('silicon-unscreened', screening)).json()) as Pick<RatesAnswer, 'notices'> & {
        points: { crossSection: { value: number } }[];
      };
    const [twin, bare] = [await reachOf('in-medium'), await reachOf('as-given')];
    expect(twin.points[0].crossSection.value).toBeGreaterThan(1.1 * bare.points[0].crossSection.value);
    expect(codesOf(twin)).toContain('screened-twin');
    expect(codesOf(bare)).toContain('unscreened-table');
    const { errors } = await problemOf(await ask('silicon', 'none'), 'invalid-input');
    expect(errors!.map(({ pointer }) => pointer)).toEqual(['/scenario/screening']);
  });
});
