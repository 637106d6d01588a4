import { describe, expect, test } from 'vitest';
import { RatesAnswer } from '../../service/schemas/rates.ts';
import { changedAt, inventedDarkMatter, inventedScenario, inventedTable, type Json } from '../support/invented.ts';
import { pointersOf, problemOf } from '../support/problem-of.ts';
import { testApp } from '../support/test-app.ts';

const app = testApp();
const rates = (body: unknown, headers?: Record<string, string>) => app.post('/v1/rates', body, headers);
const scenario = inventedScenario();

async function answered(body: unknown): Promise<RatesAnswer> {
  const response = await rates(body);
  const text = await response.text();
  expect(response.status, text.slice(0, 500)).toBe(200);
  return RatesAnswer.parse(JSON.parse(text));
}
const hashOf = async (body: unknown): Promise<string> => (await answered(body)).provenance.request.sha256;
const refusedAt = async (body: unknown): Promise<(string | undefined)[]> => pointersOf(await rates(body));

describe('POST /v1/rates', () => {
  test('POST /v1/rates: bins from 1 to maxElectrons, half-open, their sum, and what lies above', async () => {
    const answer = await answered({ ...scenario, ionization: { maxElectrons: 2 } });
    expect(answer.bins.map(({ electrons, energy }) => [electrons, energy.from, energy.to, energy.unit])).toEqual([
      [1, 1.12, 4.92, 'eV'],
      [2, 4.92, 8.72, 'eV'],
    ]);
    expect(answer.bins[0].rate.value + answer.bins[1].rate.value).toBe(answer.total.value);
    const further = await answered({ ...scenario, ionization: { maxElectrons: 3 } });
    expect(further.bins[2].rate.value).toBeGreaterThan(0);
    // the bins are integrated by themselves, the overflow as a whole: 1e-5 is their stated error
    expect(answer.overflow.value / (further.total.value + further.overflow.value - answer.total.value)).toBeCloseTo(
      1,
      4,
    );
    expect(answer.exposure).toBeUndefined();
    expect(answer.spectrum).toBeUndefined();
  });

  test('POST /v1/rates: 15 bins by default, 100 at most', async () => {
    expect((await answered(scenario)).bins).toHaveLength(15);
    expect((await answered({ ...scenario, ionization: { maxElectrons: 100 } })).bins).toHaveLength(100);
    expect(await refusedAt({ ...scenario, ionization: { maxElectrons: 101 } })).toEqual(['/ionization/maxElectrons']);
  });

  test('POST /v1/rates: the default halo is the one of the contract, and is what an empty one means', async () => {
    const halo = {
      localDensity: '0.3 GeV/cm^3',
      circularSpeed: '238 km/s',
      escapeSpeed: '544 km/s',
      laboratorySpeed: '250 km/s',
      cutoff: 'sharp',
    };
    const bare = await answered(scenario);
    expect(await answered({ ...scenario, halo })).toEqual(bare);
    expect(await answered({ ...scenario, halo: {} })).toEqual(bare);
    expect(
      await answered({
        ...scenario,
        ionization: { maxElectrons: 15, bandGap: '1.12 eV', energyPerPair: '3.8 eV' },
        spectrum: false,
        darkMatter: inventedDarkMatter({ massSplitting: '0 eV' }),
      }),
    ).toEqual(bare);
  });

  test('POST /v1/rates: gap and pair energy of the scenario take precedence over the table’s', async () => {
    const { bins } = await answered({ ...scenario, ionization: { bandGap: '2 eV', energyPerPair: '3 eV' } });
    expect(bins[0].energy).toEqual({ unit: 'eV', from: 2, to: 5 });
  });

  test.each([
    ['bandGap', ['/ionization/bandGap']],
    ['energyPerPair', ['/ionization/energyPerPair']],
  ])('POST /v1/rates: neither place having %s is an error', async (field, expected) => {
    expect(await refusedAt({ ...scenario, crystal: inventedTable({ [field]: undefined }) })).toEqual(expected);
  });

  test('POST /v1/rates: a stored table by id, by alias and inline give the same numbers', async () => {
    const stored = (await (await app.post('/v1/crystals', inventedTable())).json()) as { id: string };
    expect(await answered({ ...scenario, crystal: { id: stored.id } })).toEqual(await answered(scenario));
    const silicon = (await (await app.get('/v1/crystals/silicon')).json()) as { id: string };
    const byAlias = await answered({ ...scenario, crystal: { id: 'silicon' } });
    expect(await answered({ ...scenario, crystal: { id: silicon.id } })).toEqual(byAlias);
    expect(byAlias.provenance.crystal).toEqual({ id: silicon.id });
    expect(byAlias.total.value).toBeGreaterThan(0);
  });

  test('POST /v1/rates: linear in cross section and density', async () => {
    const once = await answered(scenario);
    const twice = await answered(changedAt(scenario, '/darkMatter/referenceCrossSection', '2e-37 cm^2'));
    const thrice = await answered({ ...scenario, halo: { localDensity: '0.9 GeV/cm^3' } });
    expect(twice.total.value / once.total.value).toBeCloseTo(2, 12);
    expect(thrice.total.value / once.total.value).toBeCloseTo(3, 12);
  });

  test('POST /v1/rates: bins out of reach are exactly 0 with error 0, and a notice names the smallest mass', async () => {
    const answer = await answered(changedAt(scenario, '/darkMatter/mass', '0.2 MeV'));
    expect(answer.bins.map(({ rate }) => rate)).toEqual(
      Array.from({ length: 15 }, () => ({ value: 0, unit: '1/(kg yr)', relativeError: 0 })),
    );
    const notice = answer.notices.find(({ code }) => code === 'unreachable-bins')!;
    // 2 E / v_max², E = 1.12 eV, v_max = 794 km/s: worked out by hand from the definition
    const smallestMev = (2 * 1.12) / (794 / 299_792.458) ** 2 / 1e6;
    expect(notice.detail).toContain(`${Number(smallestMev.toPrecision(6))} MeV`);
  });

  test('POST /v1/rates: an unscreened table brings a notice, a screened one none', async () => {
    const codes = async (id: string) =>
      (await answered({ ...scenario, crystal: { id } })).notices.map(({ code }) => code);
    expect(await codes('silicon-unscreened')).toContain('unscreened-table');
    expect(await codes('silicon')).not.toContain('unscreened-table');
    const loss = {
      formFactorSquared: undefined,
      lossFunction: [
        [1, 1, 1],
        [1, 1, 1],
      ],
      cellVolume: '40 angstrom^3',
    };
    const answer = await answered({ ...scenario, crystal: inventedTable(loss) });
    expect(answer.notices.map(({ code }) => code)).not.toContain('unscreened-table');
  });

  test('POST /v1/rates: "spectrum": true adds dR/dE whose integral is the rate', async () => {
    const { spectrum, total, overflow } = await answered({ ...scenario, spectrum: true });
    const { edges } = spectrum!.energy;
    expect(edges).toEqual([0, 4, 8, 12]);
    const integral = spectrum!.rate.values.reduce((sum, value, i) => sum + value * (edges[i + 1] - edges[i]), 0);
    expect(integral / (total.value + overflow.value)).toBeCloseTo(1, 5);
  });

  test.each([
    ['events', { kind: 'events', count: 3 }, 3],
    // Poisson: 1 − e^−μ (1 + μ + μ²/2) = 0.9 at μ = 5.3223 (a textbook value), 1 − e^−μ = 0.9 at μ = ln 10
    ['detection', { kind: 'detection', atLeast: 3, probability: 0.9 }, 5.32232],
    ['exclusion', { kind: 'exclusion', confidence: 0.9 }, Math.LN10],
  ])('POST /v1/rates: goal %s needs the exposure that gives its events', async (_kind, goal, events) => {
    const { exposure, bins } = await answered({ ...scenario, goal: { ...goal, window: { from: 2, to: 3 } } });
    expect(exposure!.expectedSignal).toBeCloseTo(events, 4);
    expect(exposure!.signalRate.value).toBeCloseTo(bins[1].rate.value + bins[2].rate.value, 9);
    expect((exposure!.needed!.value * exposure!.signalRate.value) / exposure!.expectedSignal!).toBeCloseTo(1, 12);
    expect(exposure!.expectedBackground).toBe(0);
  });

  test('POST /v1/rates: a goal no exposure can reach has needed null and a notice', async () => {
    const goal = { kind: 'events', count: 3, window: { from: 15, to: 15 } };
    const answer = await answered({ ...scenario, goal });
    expect(answer.exposure!.needed).toBeNull();
    expect(answer.notices.map(({ code }) => code)).toContain('goal-unreachable');
  });

  test('POST /v1/rates: Server-Timing, no-store and a request id come as headers; the body has no time in it', async () => {
    const response = await rates(scenario);
    expect(response.headers.get('server-timing')).toMatch(/^compute;dur=\d+(?:\.\d+)?$/);
    expect(response.headers.get('cache-control')).toBe('no-store');
    expect(response.headers.get('x-request-id')).toMatch(/^[\w-]{8,}$/);
    expect(response.headers.get('content-type')).toBe('application/json');
  });

  test('POST /v1/rates: the same request gives the same bytes, here and on another replica', async () => {
    const first = await (await rates(scenario)).text();
    expect(await (await rates(scenario)).text()).toBe(first);
    expect(await (await testApp().post('/v1/rates', scenario)).text()).toBe(first);
  });
});

describe('POST /v1/rates, provenance', () => {
  test('POST /v1/rates: names service, constants, table and canonical request', async () => {
    const { provenance } = await answered(scenario);
    expect(provenance.service).toEqual({ name: 'gramyear', version: '1.2.3' });
    expect(provenance.constants).toEqual({ codata: 2022 });
    expect(provenance.crystal!.id).toMatch(/^[0-9a-f]{64}$/);
    expect(provenance.request.sha256).toMatch(/^[0-9a-f]{64}$/);
  });

  test.each<[string, readonly unknown[]]>([
    [
      '/darkMatter/mass',
      ['10 MeV', '10MeV', ' 10.0 MeV ', '0.01 GeV', '1e-5 TeV', '1e7 eV', '10 MeV/c^2', { value: 10, unit: 'MeV' }],
    ],
    ['/darkMatter/referenceCrossSection', ['1e-37 cm^2', '1e-41 m^2', '1e-13 barn', '0.1 pbarn', '100 fbarn']],
    ['/darkMatter/mediator', [{ mass: '30 keV' }, { mass: '0.03 MeV' }, { mass: { value: 30, unit: 'keV/c^2' } }]],
    ['/darkMatter/massSplitting', ['500 meV', '0.5 eV', '5e-4 keV']],
    ['/halo/localDensity', ['0.4 GeV/cm^3', '0.4 GeV/c^2/cm^3', '400 MeV/cm^3', '4e5 GeV/m^3']],
    ['/halo/circularSpeed', ['220 km/s', '220000 m/s', { value: 220, unit: 'km/s' }]],
    ['/crystal/cellMass', ['52.32 GeV', '52320 MeV', '52.32 GeV/c^2']],
    ['/crystal/momentum/unit', ['keV', 'keV/c']],
    [
      '/goal',
      [
        { kind: 'events', count: 3 },
        { kind: 'events', count: 3, window: { from: 1, to: 15 } },
      ],
    ],
  ])('POST /v1/rates: equal %s in other forms is the same request', async (pointer, forms) => {
    const hashes = await Promise.all(forms.map((form) => hashOf(changedAt(scenario, pointer, form))));
    expect(new Set(hashes).size).toBe(1);
    expect(hashes.length).toBeGreaterThan(1);
  });

  test('POST /v1/rates: any other input is another request', async () => {
    const others: readonly Json[] = [
      scenario,
      changedAt(scenario, '/darkMatter/mass', '10.000000000001 MeV'),
      changedAt(scenario, '/darkMatter/referenceCrossSection', '1.1e-37 cm^2'),
      changedAt(scenario, '/darkMatter/mediator', 'light'),
      changedAt(scenario, '/darkMatter/mediator', { mass: '30 keV' }),
      changedAt(scenario, '/darkMatter/massSplitting', '1 eV'),
      changedAt(scenario, '/halo/cutoff', 'smooth'),
      changedAt(scenario, '/halo/laboratorySpeed', '251 km/s'),
      changedAt(scenario, '/crystal/name', 'Other invented numbers'),
      changedAt(scenario, '/crystal/screened', true),
      changedAt(scenario, '/ionization/maxElectrons', 14),
      changedAt(scenario, '/goal', { kind: 'exclusion', confidence: 0.9 }),
      changedAt(scenario, '/spectrum', true),
    ];
    const hashes = await Promise.all(others.map(hashOf));
    expect(new Set(hashes).size).toBe(others.length);
  });
});

describe('POST /v1/rates, quantities', () => {
  // how many of the fixed unit each way of writing is: exact SI prefixes, CODATA 2022 for c and e
  test.each<[string, string, string, number]>([
    ['/darkMatter/mass', '10 MeV', '1.7826619216e-26 g', 1e-9],
    ['/darkMatter/mass', '10 MeV', '1.7826619216e-29 kg', 1e-9],
    ['/halo/localDensity', '0.3 GeV/cm^3', '5.3479857648e-25 g/cm^3', 1e-9],
    ['/halo/localDensity', '0.3 GeV/cm^3', '5.3479857648e-22 kg/m^3', 1e-9],
    ['/halo/circularSpeed', '299.792458 km/s', '0.001 c', 1e-9],
    ['/crystal/cellMass', '52.32 GeV', '9.32688717e-23 g', 1e-7],
    ['/crystal/cellMass', '52.3218 GeV', '9.32720807e-26 kg', 1e-6],
  ])('POST /v1/rates: %s "%s" is "%s"', async (pointer, one, other, within) => {
    const [a, b] = await Promise.all([one, other].map((form) => answered(changedAt(scenario, pointer, form))));
    expect(Math.abs(a.total.value / b.total.value - 1)).toBeLessThan(within * 100);
    expect(a.total.value).toBeGreaterThan(0);
  });

  test.each<[string, readonly number[]]>([
    // ħc = 197.3269804 eV nm (CODATA 2022, exact to the digits shown)
    ['1/angstrom', [0.5067730716, 1.0135461431, 2.0270922863]],
    ['1/nm', [5.067730716, 10.135461431, 20.270922863]],
    ['1/bohr', [0.26817276, 0.53634552, 1.07269104]],
    ['eV', [1000, 2000, 4000]],
    ['MeV/c', [0.001, 0.002, 0.004]],
  ])('POST /v1/rates: a momentum axis in %s', async (unit, edges) => {
    const converted = await answered(changedAt(scenario, '/crystal/momentum', { unit, edges }));
    const plain = await answered(scenario);
    expect(converted.total.value / plain.total.value).toBeCloseTo(1, 7);
  });

  const places = [
    '/darkMatter/mass',
    '/darkMatter/referenceCrossSection',
    '/darkMatter/massSplitting',
    '/halo/localDensity',
    '/halo/circularSpeed',
    '/halo/escapeSpeed',
    '/halo/laboratorySpeed',
    '/crystal/cellMass',
    '/crystal/cellVolume',
    '/crystal/bandGap',
    '/crystal/energyPerPair',
    '/ionization/bandGap',
    '/ionization/energyPerPair',
  ];

  test.each(places)('POST /v1/rates: %s refuses a bare number, showing the right form', async (pointer) => {
    const { errors } = await problemOf(await rates(changedAt(scenario, pointer, 10)), 'invalid-input');
    expect(errors!.map((error) => error.pointer)).toEqual([pointer]);
    expect(errors![0].detail).toMatch(/such as "[\d.e-]+ \S+"/);
  });

  test.each(places)('POST /v1/rates: %s refuses what is no quantity of its kind', async (pointer) => {
    const wrong = [
      '10',
      '10 s',
      '1 MeV^3',
      'NaN MeV',
      'Infinity eV',
      '1e400 eV',
      '-Infinity km/s',
      '10 stick',
      '10 ton',
      '10 b',
      '',
      ' ',
      'eV',
      '1 eV eV^-1 eV 2',
      '1+1 eV',
      'é eV',
      '1 eV\u0000',
      '0x10 eV',
      'x'.repeat(5000),
      `1 ${'eV '.repeat(1667)}`,
      true,
      null,
      [],
      {},
      { value: '10', unit: 'MeV' },
      { value: 10 },
      { unit: 'MeV' },
      { value: 10, unit: 'MeV', units: 'MeV' },
      { value: null, unit: 'MeV' },
      { value: 10, unit: 'u'.repeat(5000) },
    ];
    for (const form of wrong) {
      const response = await rates(changedAt(scenario, pointer, form));
      const pointers = await pointersOf(response);
      expect(pointers.length, JSON.stringify(form)?.slice(0, 60)).toBeGreaterThan(0);
      expect(pointers.every((found) => found === pointer || found!.startsWith(`${pointer}/`))).toBe(true);
    }
  });

  test.each<[string, readonly unknown[]]>([
    ['/darkMatter/mass', ['0 MeV', '-1 MeV', '1e-400 MeV']],
    ['/darkMatter/referenceCrossSection', ['0 cm^2', '-1e-37 cm^2']],
    ['/darkMatter/mediator', [{ mass: '0 keV' }, { mass: '-30 keV' }]],
    ['/darkMatter/massSplitting', ['-1.12 eV', '-5 eV']],
    ['/halo/localDensity', ['0 GeV/cm^3', '-0.3 GeV/cm^3']],
    ['/halo/circularSpeed', ['0 km/s', '-1 km/s', '1 c', '299792.458 km/s']],
    ['/halo/escapeSpeed', ['0 km/s', '-1 km/s', '1.01 c']],
    ['/halo/laboratorySpeed', ['-1 km/s', '1 c']],
    ['/crystal/cellMass', ['0 GeV', '-52 GeV']],
    ['/crystal/bandGap', ['-1 eV']],
    ['/crystal/energyPerPair', ['0 eV', '-1 eV', '1.11 eV']],
    ['/ionization/bandGap', ['-1 eV']],
    ['/ionization/energyPerPair', ['0 eV', '-1 eV', '1.11 eV']],
  ])('POST /v1/rates: %s outside its domain', async (pointer, values) => {
    for (const value of values) {
      const [found, ...more] = await refusedAt(changedAt(scenario, pointer, value));
      expect([found?.replace(/(mediator)\/mass$/, '$1'), more], JSON.stringify(value)).toEqual([pointer, []]);
    }
  });

  test.each<[string, string]>([
    ['/halo/laboratorySpeed', '0 km/s'],
    ['/darkMatter/massSplitting', '-1.11 eV'],
    ['/ionization/bandGap', '0 eV'],
    ['/ionization/energyPerPair', '1.12 eV'],
  ])('POST /v1/rates: %s may be %s', async (pointer, value) => {
    expect((await answered(changedAt(scenario, pointer, value))).total.value).toBeGreaterThan(0);
  });
});

describe('POST /v1/rates, faults', () => {
  test.each<[string, unknown, readonly string[]]>([
    ['no dark matter', { crystal: { id: 'silicon' } }, ['/darkMatter']],
    ['no crystal', { darkMatter: inventedDarkMatter() }, ['/crystal']],
    ['nothing', {}, ['/darkMatter', '/crystal']],
    ['null', null, ['']],
    ['a list', [], ['']],
    ['a text', '"text"', ['']],
    ['unknown mediator', changedAt(scenario, '/darkMatter/mediator', 'medium'), ['/darkMatter/mediator']],
    ['unknown cutoff', changedAt(scenario, '/halo/cutoff', 'soft'), ['/halo/cutoff']],
    ['unknown goal', changedAt(scenario, '/goal', { kind: 'fame' }), ['/goal/kind']],
    ['no goal kind', changedAt(scenario, '/goal', {}), ['/goal/kind']],
    ['no event', changedAt(scenario, '/goal', { kind: 'events', count: 0 }), ['/goal/count']],
    [
      'part of an event',
      changedAt(scenario, '/goal', { kind: 'detection', atLeast: 0.5, probability: 0.9 }),
      ['/goal/atLeast'],
    ],
    [
      'certainty',
      changedAt(scenario, '/goal', { kind: 'detection', atLeast: 1, probability: 1 }),
      ['/goal/probability'],
    ],
    ['no confidence', changedAt(scenario, '/goal', { kind: 'exclusion' }), ['/goal/confidence']],
    [
      'a field of another goal',
      changedAt(scenario, '/goal', { kind: 'events', count: 3, confidence: 0.9 }),
      ['/goal/confidence'],
    ],
    [
      'a window the wrong way round',
      changedAt(scenario, '/goal', { kind: 'events', count: 3, window: { from: 4, to: 2 } }),
      ['/goal/window/to'],
    ],
    [
      'a window beyond the last bin',
      { ...scenario, ionization: { maxElectrons: 5 }, goal: { kind: 'events', count: 3, window: { from: 2, to: 6 } } },
      ['/goal/window/to'],
    ],
    [
      'a window from 0',
      changedAt(scenario, '/goal', { kind: 'events', count: 3, window: { from: 0, to: 2 } }),
      ['/goal/window/from'],
    ],
    ['part of an electron', changedAt(scenario, '/ionization/maxElectrons', 1.5), ['/ionization/maxElectrons']],
    ['spectrum as text', changedAt(scenario, '/spectrum', 'true'), ['/spectrum']],
    ['an unknown id', { ...scenario, crystal: { id: 'unobtainium' } }, ['/crystal/id']],
    ['an id that is a path', { ...scenario, crystal: { id: '../../etc/passwd' } }, ['/crystal/id']],
    ['an id of 5,000 characters', { ...scenario, crystal: { id: 'x'.repeat(5000) } }, ['/crystal/id']],
    ['an id that is a number', { ...scenario, crystal: { id: 5 } }, ['/crystal/id']],
    ['an id and more', { ...scenario, crystal: { id: 'silicon', name: 'x' } }, ['/crystal/name']],
    ['a misspelt field', changedAt(scenario, '/halo/escapespeed', '544 km/s'), ['/halo/escapespeed']],
    ['a field that is not known', changedAt(scenario, '/halo/day', '2027-06-02'), ['/halo/day']],
    [
      'a field with a slash and a tilde',
      changedAt(scenario, '/darkMatter', inventedDarkMatter({ 'a/b~c': 1 })),
      ['/darkMatter/a~1b~0c'],
    ],
  ])('POST /v1/rates: %s', async (_what, body, pointers) => {
    expect(await refusedAt(body)).toEqual(pointers);
  });

  test.each(['__proto__', 'constructor', 'toString', 'hasOwnProperty'])(
    'POST /v1/rates: a field named %s',
    async (name) => {
      const places = ['', '/darkMatter', '/halo', '/ionization', '/crystal', '/crystal/momentum'];
      for (const place of places) {
        expect(await refusedAt(changedAt(scenario, `${place}/${name}`, { mass: '10 MeV' }))).toEqual([
          `${place}/${name}`,
        ]);
      }
      expect(({} as Json)['mass']).toBeUndefined();
    },
  );

  test('POST /v1/rates: every fault at once, an unknown table among them', async () => {
    const body = {
      darkMatter: { mass: 10, referenceCrossSection: '1e-37 s', mediator: 'medium' },
      halo: { escapeSpeed: '-1 km/s', date: 'tomorrow' },
      crystal: { id: 'unobtainium' },
      ionization: { bandGap: '3 eV', energyPerPair: '2 eV', maxElectrons: 0 },
      goal: { kind: 'detection', atLeast: 0, probability: 2 },
      extra: 1,
    };
    expect((await refusedAt(body)).sort()).toEqual(
      [
        '/crystal/id',
        '/darkMatter/mass',
        '/darkMatter/mediator',
        '/darkMatter/referenceCrossSection',
        '/extra',
        '/goal/atLeast',
        '/goal/probability',
        '/halo/date',
        '/halo/escapeSpeed',
        '/ionization/energyPerPair',
        '/ionization/maxElectrons',
      ].sort(),
    );
  });

  test('POST /v1/rates: 50 faults are listed at most, and all of them counted', async () => {
    const extra = Object.fromEntries(Array.from({ length: 5000 }, (_, i) => [`extra${i}`, i]));
    const problem = await problemOf(await rates({ ...scenario, ...extra }), 'invalid-input');
    expect(problem.errors).toHaveLength(50);
    expect(problem.detail).toContain('5000');
  });

  test('POST /v1/rates: a number beyond what a double holds', async () => {
    const places: readonly [string, string][] = [
      ['"edges":[1,', '/crystal/momentum/edges/0'],
      ['"electronsPerCell":8', '/crystal/electronsPerCell'],
      ['[[0.1', '/crystal/formFactorSquared/0/0'],
      ['"maxElectrons":7', '/ionization/maxElectrons'],
      ['"count":3', '/goal/count'],
    ];
    const text = JSON.stringify({
      ...scenario,
      crystal: inventedTable({ electronsPerCell: 8 }),
      ionization: { maxElectrons: 7 },
      goal: { kind: 'events', count: 3 },
    });
    for (const [place, pointer] of places) {
      expect(text).toContain(place);
      expect(await refusedAt(text.replace(place, place.replace(/[\d.]+(?=,?$)/, '1e400')))).toEqual([pointer]);
    }
  });

  test('POST /v1/rates: a momentum axis from 0 where energy plus splitting can vanish', async () => {
    const crystal = inventedTable({ momentum: { unit: 'keV', edges: [0, 2, 4] } });
    expect((await answered({ ...scenario, crystal })).total.value).toBeGreaterThan(0);
    expect(await refusedAt({ ...scenario, crystal, ionization: { bandGap: '0 eV' } })).toEqual(['/crystal/momentum']);
  });
});
