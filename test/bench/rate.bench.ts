/**
 * `npm run bench`: what a rate costs. One run, ratios of the shortest times: a rate on a 900 × 500 table from a stored table, in
 * the worker and as a whole request, against a plain compiled C loop over the same cells (needs a C compiler: cc).
 */
import { execFileSync, spawn } from 'node:child_process';
import fs from 'node:fs';
import http from 'node:http';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import { standardHalo } from '../../physics/halo/standard-halo.ts';

const ROWS = 900;
const COLUMNS = 500;
const REPETITIONS = 200;
const folder = fs.mkdtempSync(path.join(os.tmpdir(), 'gramyear-bench-'));
const momentumEv = Float64Array.from({ length: ROWS + 1 }, (_, i) => i * 80);
const energyEv = Float64Array.from({ length: COLUMNS + 1 }, (_, j) => j * 0.1);
/** Invented numbers. */
const values = Float64Array.from({ length: ROWS * COLUMNS }, (_, k) => {
  const [i, j] = [Math.floor(k / COLUMNS), k % COLUMNS];
  return Number(
    (Math.exp(-(((i * 0.08 - 8) / 15) ** 2) - j / 80) * (1 + 0.3 * Math.sin(i * 12.9 + j * 7.7))).toPrecision(6),
  );
});

const agent = new http.Agent({ keepAlive: true });

/** A request by the plain client: what is timed is the service, not the comforts of fetch. */
function timedPost(address: string, route: string, body: unknown): Promise<{ serverTiming: string }> {
  return new Promise((resolve, reject) => {
    const request = http.request(
      address + route,
      { method: 'POST', agent, headers: { 'Content-Type': 'application/json' } },
      (response) => {
        response.resume();
        response.on('end', () => {
          if (response.statusCode === 200) resolve({ serverTiming: String(response.headers['server-timing']) });
          else reject(new Error(`status ${response.statusCode}`));
        });
      },
    );
    request.on('error', reject);
    request.end(JSON.stringify(body));
  });
}

function plainLoop(massEv: number): number {
  const binary = path.join(folder, 'plain-loop');
  if (!fs.existsSync(binary))
    execFileSync('cc', ['-O2', '-o', binary, fileURLToPath(new URL('plain-loop.c', import.meta.url))]);
  const halo = standardHalo({
    circularSpeedKmPerS: 238,
    escapeSpeedKmPerS: 544,
    laboratorySpeedKmPerS: 250,
    cutoff: 'sharp',
  });
  const samples = 4096;
  const eta = Float64Array.from({ length: samples + 1 }, (_, k) =>
    halo.meanInverseSpeed((k * halo.largestSpeedKmPerS) / samples),
  );
  const head = Float64Array.from([massEv, halo.largestSpeedKmPerS, samples, REPETITIONS]);
  const parts = [Float64Array.from([ROWS, COLUMNS]), momentumEv, energyEv, values, head, eta];
  const input = Buffer.concat(parts.map((part) => Buffer.from(part.buffer)));
  return Number(execFileSync(binary, { input }).toString().split(' ')[0]);
}

const service = spawn(process.execPath, [fileURLToPath(new URL('../../dist/service/main.js', import.meta.url))], {
  env: { ...process.env, PORT: '0', DATA_DIR: path.join(folder, 'data'), WORKERS: '1', LOG_LEVEL: 'warn' },
  stdio: ['ignore', 'pipe', 'inherit'],
});
try {
  const address = await new Promise<string>((resolve) => {
    service.stdout.on('data', (chunk: Buffer) => resolve(/http:\/\/\S+/.exec(chunk.toString())![0]));
  });
  const post = async (route: string, body: unknown): Promise<Response> =>
    fetch(address + route, {
      method: 'POST',
      headers: { 'Content-Type': 'application/json' },
      body: JSON.stringify(body),
    });
  const stored = await post('/v1/crystals', {
    name: 'Invented numbers',
    cellMass: '52.32 GeV',
    momentum: { unit: 'eV', edges: { start: 0, step: 80, count: ROWS + 1 } },
    energy: { unit: 'eV', edges: [...energyEv] },
    formFactorSquared: Array.from({ length: ROWS }, (_, i) =>
      Array.from(values.subarray(i * COLUMNS, (i + 1) * COLUMNS)),
    ),
  });
  const { id } = (await stored.json()) as { id: string };

  const rate = async (
    mass: number,
    mediator: string,
    more: object = {},
  ): Promise<{ compute: number; whole: number }> => {
    const began = performance.now();
    const answer = await timedPost(address, '/v1/rates', {
      darkMatter: { mass: `${mass} MeV`, referenceCrossSection: '1e-37 cm^2', mediator },
      crystal: { id },
      ionization: { bandGap: '1.12 eV', energyPerPair: '3.8 eV', maxElectrons: 12 },
      ...more,
    });
    return { compute: Number(/dur=([\d.]+)/.exec(answer.serverTiming)?.[1]), whole: performance.now() - began };
  };
  const shortest = async (run: () => Promise<{ compute: number; whole: number }>) => {
    const all = [];
    for (let k = 0; k < REPETITIONS; k++) all.push(await run());
    return {
      compute: Math.min(...all.map((t) => t.compute)),
      whole: Math.min(...all.map((t) => t.whole)),
      first: all[0],
    };
  };

  // client and service as they are after a few hundred requests, not in their first second
  for (let k = 0; k < 2 * REPETITIONS; k++) await rate(100, 'heavy');
  for (const [mass, mediator] of [
    [10, 'heavy'],
    [10, 'light'],
    [100, 'heavy'],
    [100, 'light'],
    [1000, 'heavy'],
  ] as const) {
    const loop = plainLoop(mass * 1e6);
    const { compute, whole } = await shortest(() => rate(mass, mediator));
    process.stdout.write(
      `${mass} MeV, ${mediator}: compute / C loop ${(compute / loop).toFixed(2)}, whole request / compute ${(whole / compute).toFixed(2)}` +
        ` (C loop ${loop.toFixed(2)} ms, compute ${compute.toFixed(2)} ms, whole ${whole.toFixed(2)} ms)\n`,
    );
  }

  const coldTable = async (k: number): Promise<string> => {
    const answer = await post('/v1/crystals', {
      name: `Invented numbers ${k}`,
      cellMass: '52.32 GeV',
      bandGap: '1.12 eV',
      energyPerPair: '3.8 eV',
      momentum: { unit: 'eV', edges: { start: 0, step: 80, count: ROWS + 1 } },
      energy: { unit: 'eV', edges: [...energyEv] },
      formFactorSquared: Array.from({ length: ROWS }, (_, i) =>
        Array.from(values.subarray(i * COLUMNS, (i + 1) * COLUMNS)),
      ),
    });
    return ((await answer.json()) as { id: string }).id;
  };
  // a table that no thread has seen: its momentum panels are computed on the way
  const masses = 200;
  const cold = [];
  for (let k = 0; k < 3; k++) {
    const crystal = await coldTable(k);
    const began = performance.now();
    await (
      await post('/v1/reach', {
        scenario: {
          darkMatter: { mediator: 'heavy' },
          crystal: { id: crystal },
          goal: { kind: 'exclusion', confidence: 0.9 },
        },
        exposure: '1 kg yr',
        masses: { from: '1 MeV', to: '1 GeV', count: masses },
      })
    ).text();
    cold.push(performance.now() - began);
  }
  const firstRates = [];
  for (let k = 0; k < 5; k++) {
    const crystal = await coldTable(10 + k);
    firstRates.push((await rate(100, 'heavy', { crystal: { id: crystal } })).compute);
  }
  const warmRate = (await shortest(() => rate(100, 'heavy'))).compute;
  const reach = Math.min(...cold);
  process.stdout.write(
    `reach of ${masses} masses, cold, one worker / ${masses} rates: ${(reach / (masses * Math.min(...firstRates))).toFixed(2)} of a first rate on a table, ` +
      `${(reach / (masses * warmRate)).toFixed(2)} of a repeated one (reach ${reach.toFixed(0)} ms)\n`,
  );

  const fano = {
    ionization: { bandGap: '1.12 eV', energyPerPair: '3.8 eV', maxElectrons: 12, model: 'fano', fanoFactor: 0.12 },
    readout: { noise: 0.16 },
  };
  const backgrounds = Array.from({ length: 5 }, (_, k) => ({
    name: `background ${k}`,
    kind: 'flat',
    rate: `${100 * (k + 1)} 1/(kg yr keV)`,
    relativeUncertainty: 0.1 * (k + 1),
  }));
  for (const [name, base] of [
    ['step', {}],
    ['fano and noise', fano],
  ] as const) {
    for (const goal of [
      { kind: 'exclusion', confidence: 0.9, method: 'likelihood' },
      { kind: 'discovery', significance: 3 },
    ]) {
      const without = await shortest(() => rate(100, 'heavy', { ...base, goal }));
      const with5 = await shortest(() => rate(100, 'heavy', { ...base, goal, backgrounds }));
      process.stdout.write(
        `${goal.kind}, ${name}, 12 bins: 5 uncertain backgrounds / none ${(with5.compute / without.compute).toFixed(2)}\n`,
      );
    }
  }
} finally {
  agent.destroy();
  service.kill('SIGTERM');
  fs.rmSync(folder, { recursive: true, force: true });
}
