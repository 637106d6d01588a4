import { describe, expect, it } from 'vitest';
import { SPEED_OF_LIGHT_KM_PER_S } from '../../physics/constants.ts';
import type { RatesAnswer } from '../../service/schemas/rates.ts';
import type { ReachAnswer } from '../../service/schemas/reach.ts';
import { changedAt, inventedTable, type Json } from '../support/invented.ts';
import { pointersOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';
import { xmlTree } from '../support/xml-tree.ts';

const app = testApp();
const dark = {
  name: 'dark current',
  kind: 'darkCurrent',
  current: '1e-4 1/day',
  pixelMass: '0.35 ug',
  readoutInterval: '2 h',
};

const request = (over: Json = {}, scenario: Json = {}): Json => ({
  scenario: {
    darkMatter: { mediator: 'heavy' },
    crystal: { id: 'silicon' },
    ionization: { maxElectrons: 10 },
    goal: { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 10 } },
    ...scenario,
  },
  exposure: '100 g yr',
  masses: { unit: 'MeV', values: [1, 3, 10, 100] },
  ...over,
});

async function reach(body: Json): Promise<ReachAnswer> {
  const response = await app.post('/v1/reach', body);
  const text = await response.text();
  expect(response.status, text.slice(0, 500)).toBe(200);
  return JSON.parse(text) as ReachAnswer;
}

const sections = (answer: ReachAnswer): (number | null)[] =>
  answer.points.map(({ crossSection }) => crossSection?.value ?? null);

describe('POST /v1/reach', () => {
  it('is the inverse of POST /v1/rates: at the exposure that rates needs for σ̄ₑ it returns σ̄ₑ, for every goal', async () => {
    const window = { from: 2, to: 10 };
    const goals = [
      { kind: 'events', count: 3, window },
      { kind: 'detection', atLeast: 2, probability: 0.9, window },
      { kind: 'exclusion', confidence: 0.9, window },
      { kind: 'exclusion', confidence: 0.9, method: 'unified', window },
      { kind: 'exclusion', confidence: 0.9, method: 'likelihood', window },
      { kind: 'discovery', significance: 3, window },
    ];
    for (const goal of goals) {
      const relativeUncertainty = goal.kind === 'discovery' || goal.method === 'likelihood' ? 0.02 : 0;
      const detector = {
        readout: { noise: 0.15, efficiency: 0.9 },
        backgrounds: [{ ...dark, relativeUncertainty }],
        ionization: { maxElectrons: 10 },
      };
      const forward = await app.post('/v1/rates', {
        darkMatter: { mass: '10 MeV', referenceCrossSection: '2e-40 cm^2', mediator: 'heavy' },
        crystal: { id: 'silicon' },
        goal,
        ...detector,
      });
      const { exposure } = (await forward.json()) as RatesAnswer;
      const answer = await reach(
        request(
          { exposure: { value: exposure!.needed!.value, unit: 'kg yr' }, masses: { unit: 'MeV', values: [10] } },
          { goal, ...detector },
        ),
      );
      expect(answer.points[0].crossSection!.value / 2e-40, JSON.stringify(goal)).toBeCloseTo(1, 7);
    }
  });

  it('twice a background-free exposure halves it', async () => {
    const [once, twice] = [await reach(request()), await reach(request({ exposure: '200 g yr' }))].map(sections);
    once.forEach((value, i) => {
      if (value === null) expect(twice[i]).toBeNull();
      else expect(twice[i]! / value).toBeCloseTo(0.5, 10);
    });
  });

  it('lightestMass is exactly 2(E + δ)/v_max², and nothing at or below it is reached', async () => {
    const vMax = 794 / SPEED_OF_LIGHT_KM_PER_S;
    for (const [splitting, delta] of [
      ['0 eV', 0],
      ['0.5 eV', 0.5],
      ['-0.8 eV', -0.8],
    ] as const) {
      const edge = (2 * (4.92 + delta)) / vMax ** 2 / 1e6;
      const masses = { unit: 'MeV', values: [edge * 0.99, edge, edge * 1.01] };
      const answer = await reach(request({ masses }, { darkMatter: { mediator: 'heavy', massSplitting: splitting } }));
      expect(answer.lightestMass!.value / edge).toBeCloseTo(1, 12);
      expect(sections(answer).map((value) => value !== null)).toEqual([false, false, true]);
      expect(answer.notices.map(({ code }) => code)).toContain('unreached-masses');
    }
    const noisy = await reach(request({}, { readout: { noise: 0.2 } }));
    expect(noisy.lightestMass!.value).toBeCloseTo((2 * 1.12) / vMax ** 2 / 1e6, 9); // any charge can be read as two electrons
    const fano = await reach(request({}, { ionization: { maxElectrons: 10, model: 'fano', fanoFactor: 0.12 } }));
    expect(fano.lightestMass!.value).toBeCloseTo((2 * 2.24) / vMax ** 2 / 1e6, 9); // two pairs cost two gaps
  });

  it('silicon, 100 g yr, two electrons, no background, 90 %: lowest between a few and some tens of MeV (common practice)', async () => {
    const answer = await reach(request({ masses: { from: '1 MeV', to: '1 GeV', count: 31 } }));
    expect(answer.points).toHaveLength(31);
    expect(answer.points[0].mass.value).toBe(1);
    expect(answer.points[30].mass.value).toBe(1000);
    expect(answer.best!.mass.value).toBeGreaterThan(3);
    expect(answer.best!.mass.value).toBeLessThan(50);
    expect(answer.best!.crossSection.value).toBe(Math.min(...sections(answer).flatMap((value) => value ?? [])));
  });

  it('heavy and light are the limits of a finite mediator', async () => {
    for (const [mediator, mass] of [
      ['heavy', '1 TeV'],
      ['light', '1e-6 eV'],
    ] as const) {
      const limit = sections(await reach(request({}, { darkMatter: { mediator } })));
      const near = sections(await reach(request({}, { darkMatter: { mediator: { mass } } })));
      limit.forEach((value, i) => {
        if (value !== null) expect(near[i]! / value).toBeCloseTo(1, 6);
      });
    }
  });

  it('NDJSON: the points as lines and the rest as the last; CSV: a header with units and a row a mass', async () => {
    const whole = await reach(request());
    const lines = (await (await app.post('/v1/reach', request(), { accept: 'application/x-ndjson' })).text())
      .trimEnd()
      .split('\n');
    expect(lines.slice(0, -1).map((line) => JSON.parse(line))).toEqual(whole.points);
    const { points: _points, ...summary } = whole;
    expect(JSON.parse(lines.at(-1)!)).toEqual(summary);
    const csv = await app.post('/v1/reach', request(), { accept: 'text/csv' });
    expect(csv.headers.get('content-type')).toBe('text/csv; charset=utf-8; header=present');
    const rows = (await csv.text())
      .trimEnd()
      .split(/\r?\n/)
      .map((row) => row.split(','));
    expect(rows[0].slice(0, 2)).toEqual(['mass (MeV)', 'cross section (cm^2)']);
    expect(rows.slice(1).map((row) => (row[1] === '' ? null : Number(row[1])))).toEqual(sections(whole));
  });

  it('image/svg+xml: a figure that is well-formed and says what it shows', async () => {
    const response = await app.post('/v1/reach', request(), { accept: 'image/svg+xml' });
    expect(response.headers.get('content-type')).toBe('image/svg+xml');
    const text = await response.text();
    expect(xmlTree(text).name).toBe('svg');
    expect(text).toContain('100 g yr');
    expect(text).toContain('planning estimate');
  });

  it('a list of tables gives a band: lowest, highest, and which table is which', async () => {
    const answer = await reach(request({}, { crystal: [{ id: 'silicon' }, { id: 'silicon-unscreened' }] }));
    const [screened, bare] = [
      await reach(request()),
      await reach(request({}, { crystal: { id: 'silicon-unscreened' } })),
    ];
    expect(sections(answer)).toEqual(sections(screened));
    const ids = [screened, bare].map(({ provenance }) => provenance.crystal!.id);
    answer.points.forEach(({ band }, i) => {
      const [s, b] = [sections(screened)[i], sections(bare)[i]];
      if (s === null) expect(band).toMatchObject({ lowest: null, highest: null });
      else
        expect(band).toEqual({
          lowest: { value: b, unit: 'cm^2' },
          highest: { value: s, unit: 'cm^2' },
          lowestCrystal: ids[1],
          highestCrystal: ids[0],
        });
    });
  });

  it('the same request gives the same bytes; each other one another hash', async () => {
    const text = async (body: Json): Promise<string> => (await app.post('/v1/reach', body)).text();
    expect(await text(request())).toBe(await text(request({ exposure: '0.1 kg yr' })));
    const hashes = await Promise.all(
      [request(), request({ exposure: '101 g yr' }), request({}, { readout: {} })].map(
        async (body) => (await reach(body)).provenance.request.sha256,
      ),
    );
    expect(new Set(hashes).size).toBe(3);
  });

  it.each([
    ['/scenario/goal', undefined, ['/scenario/goal']],
    ['/scenario/darkMatter/mass', '10 MeV', ['/scenario/darkMatter/mass']],
    ['/scenario/spectrum', true, ['/scenario/spectrum']],
    ['/exposure', '1 kg', ['/exposure']],
    ['/exposure', 3, ['/exposure']],
    ['/masses', { from: '10 MeV', to: '1 MeV', count: 5 }, ['/masses/to']],
    ['/masses', { from: '1 MeV', to: '10 MeV', count: 1001 }, ['/masses/count']],
    ['/masses', { unit: 'MeV', values: [2, 1] }, ['/masses/values/1']],
    ['/masses', { unit: 'kV', values: [1] }, ['/masses/unit']],
    ['/scenario/crystal', [{ id: 'silicon' }, { id: 'nowhere' }], ['/scenario/crystal/1/id']],
    ['/scenario/crystal', inventedTable({ bandGap: undefined }), ['/scenario/ionization/bandGap']],
  ] as [string, unknown, string[]][])('%s %j: told where', async (pointer, value, expected) => {
    expect(await pointersOf(await app.post('/v1/reach', changedAt(request(), pointer, value)))).toEqual(expected);
  });

  it('406 for a form it does not have', async () => {
    expect((await app.post('/v1/reach', request(), { accept: 'application/pdf' })).status).toBe(406);
  });
});
