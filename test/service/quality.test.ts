/** The quality report, through the service. What it is made of: test/physics/crystal/quality.test.ts. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { Compute } from '../../service/compute/compute.ts';
import { CrystalDescription } from '../../service/schemas/crystal.ts';
import type { Quality } from '../../service/schemas/quality.ts';
import { appWithAllBuiltIns } from '../support/all-built-ins.ts';
import { inProcessCompute } from '../support/in-process-compute.ts';
import { inventedTable, type Json } from '../support/invented.ts';
import { problemOf } from '../support/problem-of.ts';
import { type TestApp, testApp } from '../support/test-app.ts';

const app = appWithAllBuiltIns();
/** α mₑ, keV. */
const ALPHA_ME_KEV = 3.7289;

async function qualityOf(name: string, at: TestApp = app): Promise<Quality> {
  const response = await at.get(`/v1/crystals/${name}`);
  expect(response.status).toBe(200);
  return CrystalDescription.parse(await response.json()).quality!;
}

async function posted(body: unknown, at: TestApp = app) {
  const response = await at.post('/v1/crystals', body);
  const text = await response.text();
  expect([200, 201], text.slice(0, 300)).toContain(response.status);
  return CrystalDescription.parse(JSON.parse(text));
}

async function valuesOf(name: string): Promise<Json> {
  return (await (await app.get(`/v1/crystals/${name}/values`)).json()) as Json;
}

function findingOf({ findings }: Quality, code: string) {
  return findings.find((finding) => finding.code === code);
}

describe('GET /v1/crystals/{id}: quality of the built-in tables', () => {
  // Measured: static ε 11.7, 16.2, 5.7, 10.9 (ions do not follow), plasmons 16.7, 16, 34, 16 eV (service/tables/README.md).
  // Achieved, screened and unscreened table: silicon ε 11.1 and 11.6, plasmon 17.8 and 17.9 eV; germanium 16.2 and 16.9, 17.6 and 17.7;
  // diamond 5.2 and 5.4, 36.9; gallium arsenide 12.2 and 11.6, 18.1. All plasmons are too high: the rigid shift of the bands.
  test.each([
    ['silicon', 'fine', 11.7, 16.7, 0.1, 1.5],
    ['silicon-unscreened', 'fine', 11.7, 16.7, 0.1, 1.5],
    ['germanium', 'look', 16.2, 16, 0.1, 2],
    ['germanium-unscreened', 'look', 16.2, 16, 0.1, 2],
    ['diamond', 'fine', 5.7, 34, 0.1, 3],
    ['diamond-unscreened', 'fine', 5.7, 34, 0.1, 3],
    ['gallium-arsenide', 'look', 10.9, 16, 0.15, 2.1],
    ['gallium-arsenide-unscreened', 'look', 10.9, 16, 0.15, 2.1],
  ])(
    'GET /v1/crystals/%s: %s; static ε near %s and plasmon near %s eV as measured',
    async (name, verdict, epsilon, plasmonEv, within, withinEv) => {
      const quality = await qualityOf(name);
      expect(quality.verdict).toBe(verdict);
      const { staticDielectric, plasmon } = quality.opticalLimit!;
      expect(Math.abs(staticDielectric!.value / epsilon - 1)).toBeLessThan(within);
      expect(Math.abs(plasmon!.value - plasmonEv)).toBeLessThan(withinEv);
      for (const { grade } of quality.findings) expect(grade).not.toBe('wrong');
      expect(quality.masses.map(({ mediator }) => mediator)).toEqual(['heavy', 'light']);
    },
  );

  test.each(['silicon', 'silicon-unscreened'])(
    'GET /v1/crystals/%s: f-sum share 0.85 to 1.05 for 0.05 < q/αmₑ < 1, below 50 eV',
    async (name) => {
      const { sumRule, coverage, onset } = await qualityOf(name);
      expect(coverage.energy.to).toBe(50);
      expect(coverage.momentum.count).toBe(721);
      expect(onset!.value).toBeCloseTo(1.1, 1);
      let compared = 0;
      sumRule!.momentum.values.forEach((kev, i) => {
        if (kev <= 0.05 * ALPHA_ME_KEV || kev >= ALPHA_ME_KEV) return;
        expect(sumRule!.share[i]).toBeGreaterThan(0.85);
        expect(sumRule!.share[i]).toBeLessThan(1.05);
        compared++;
      });
      expect(compared).toBe(38);
      expect(sumRule!.electronsFound! / 8).toBeGreaterThan(0.9);
    },
  );

  test.each(['germanium', 'gallium-arsenide'])(
    'GET /v1/crystals/%s: its share near 0.4 is explained by 3d strength above 50 eV and is not called wrong',
    async (name) => {
      const quality = await qualityOf(name);
      const finding = findingOf(quality, 'strength-above')!;
      expect(finding.grade).toBe('look');
      expect(finding.detail).toMatch(/28 electrons below 50 eV.*3d.*rates above 50 eV are missing/);
      const low = quality.sumRule!.share.filter((_, i) => quality.sumRule!.momentum.values[i] < ALPHA_ME_KEV / 2);
      for (const share of low.slice(2)) expect(Math.abs(share! - 0.36)).toBeLessThan(0.06);
      expect(low.length).toBe(20);
    },
  );

  test('GET /v1/crystals: the list goes without reports', async () => {
    const { crystals } = (await (await app.get('/v1/crystals')).json()) as { crystals: Json[] };
    expect(crystals).toHaveLength(8);
    for (const crystal of crystals) expect(crystal).not.toHaveProperty('quality');
  });

  test('GET /v1/crystals/{id}: by alias and by id the same report, worked out once, off the event loop', async () => {
    const asked: string[] = [];
    const inProcess = inProcessCompute();
    const compute: Compute = {
      ...inProcess,
      run: (task, input, options) => {
        asked.push(task);
        return inProcess.run(task, input, options);
      },
    };
    const counting = testApp({ compute });
    const { id } = await posted(inventedTable({ name: 'Asked for often' }), counting);
    expect(asked).toEqual(['quality']); // with the unit that was sent
    const first = await (await counting.get(`/v1/crystals/${id}`)).text();
    expect(await (await counting.get(`/v1/crystals/${id}`)).text()).toBe(first);
    expect(asked).toEqual(['quality', 'quality']);
  });

  test('GET /v1/crystals/{id}: a report past the deadline is a 503, and the table is stored all the same', async () => {
    const inProcess = inProcessCompute();
    const compute: Compute = {
      ...inProcess,
      run: (task, input, options) =>
        task === 'quality'
          ? new Promise((_, reject) => {
              options!.signal!.addEventListener('abort', () => reject(options!.signal!.reason));
            })
          : inProcess.run(task, input, options),
    };
    const slow = testApp({ compute, deadlineSeconds: 0.05 });
    await problemOf(await slow.post('/v1/crystals', inventedTable({ name: 'Slow' })), 'busy');
    const { crystals } = (await (await slow.get('/v1/crystals')).json()) as {
      crystals: { id: string; name: string }[];
    };
    const { id } = crystals.find(({ name }) => name === 'Slow')!;
    await problemOf(await slow.get(`/v1/crystals/${id}`), 'busy');
    expect((await slow.get(`/v1/crystals/${id}/values`)).status).toBe(200);
  });
});

describe('POST /v1/crystals: quality', () => {
  // the numbers of the axis are what they were: only what is said of them changes
  test.each<[string, string, (kev: number) => number, string]>([
    ['keV numbers said to be eV', 'eV', (kev) => kev, 'read in keV instead of eV'],
    ['eV numbers said to be keV', 'keV', (kev) => kev * 1e3, 'read in eV instead of keV'],
    ['α mₑ numbers said to be keV', 'keV', (kev) => kev / ALPHA_ME_KEV, 'read in alpha m_e (1/bohr) instead of keV'],
    ['keV numbers said to be 1/angstrom', '1/angstrom', (kev) => kev, 'read in keV instead of 1/angstrom'],
    ['keV numbers said to be eV/c', 'eV/c', (kev) => kev, 'read in keV instead of eV'],
  ])('POST /v1/crystals: %s is wrong, and the unit that fits is named', async (what, unit, numbers, says) => {
    for (const name of ['silicon', 'germanium-unscreened']) {
      const table = await valuesOf(name);
      const { edges } = table['momentum'] as { edges: number[] };
      const momentum = { unit, edges: edges.map(numbers) };
      const { id, quality } = await posted({ ...table, name: `${name}, ${what}`, momentum });
      expect(quality!.verdict).toBe('wrong');
      const finding = findingOf(quality!, 'units')!;
      expect(finding.grade).toBe('wrong');
      expect(finding.detail).toContain(says);
      expect(finding.detail).toMatch(/so .* is the unit that would fit/);
      expect((await qualityOf(id)).verdict).toBe('wrong'); // later, when what was sent is no longer known
    }
  });

  test('POST /v1/crystals: silicon downloaded and posted in 1/angstrom is as fine as it was', async () => {
    const table = await valuesOf('silicon');
    const { edges } = table['momentum'] as { edges: number[] };
    const momentum = { unit: '1/angstrom', edges: edges.map((kev) => kev / 1.973269804593025) };
    expect((await posted({ ...table, name: 'silicon again', momentum })).quality!.verdict).toBe('fine');
  });

  test('POST /v1/crystals: any table is answered with a report of finite numbers', async () => {
    const size = fc.constantFrom(5e-324, 1e-300, 1e-30, 0, 1, 1e30, 1e300);
    const anyTable = fc.record({
      values: fc.array(size, { minLength: 6, maxLength: 6 }),
      cellVolume: fc.constantFrom(undefined, '1e-30 angstrom^3', '40 angstrom^3', '1e30 angstrom^3'),
      electronsPerCell: fc.constantFrom(undefined, 1 / 3, 8, 1e300),
      bandGap: fc.constantFrom(undefined, '0 eV', '1e-300 eV', '1.12 eV', '1e300 eV'),
      start: fc.constantFrom(0, 1e-30, 1),
      scale: fc.constantFrom(1e-200, 1e-3, 1, 1e100),
      quantity: fc.constantFrom('formFactorSquared', 'lossFunction'),
    });
    let answered = 0;
    await fc.assert(
      fc.asyncProperty(anyTable, async ({ values, start, scale, quantity, ...said }) => {
        const body = inventedTable({
          ...said,
          ...(quantity === 'lossFunction' ? { cellVolume: said.cellVolume ?? '40 angstrom^3' } : {}),
          energyPerPair: undefined,
          formFactorSquared: undefined,
          momentum: { unit: 'keV', edges: [start * scale, 2 * scale, 4 * scale] },
          energy: { unit: 'eV', edges: [0, 4 * scale, 8 * scale, 12 * scale] },
          [quantity]: [values.slice(0, 3), values.slice(3)],
        });
        const { quality } = await posted(body, testApp());
        expect(JSON.stringify(quality)).not.toMatch(/NaN|Infinity/);
        answered++;
      }),
      { numRuns: 40, seed: 5 },
    );
    expect(answered).toBe(40);
  });
});
