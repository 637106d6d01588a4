/**
 * `npm run demo`: starts the service on a free port, asks it the question it is for, prints the answer, stops it.
 */
import { type ChildProcess, spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';
import type { RatesAnswer } from './schemas/rates.ts';

const QUESTION = {
  darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-41 cm^2', mediator: 'heavy' },
  crystal: { id: 'silicon' },
  ionization: { maxElectrons: 10 },
  goal: { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 10 } },
};

const BAR_WIDTH = 40;

/** The address in the service's start line; rejects if it ends before. */
function addressOf(service: ChildProcess): Promise<string> {
  return new Promise((resolve, reject) => {
    service.once('exit', (code) => reject(new Error(`the service ended with exit code ${code}`)));
    service.stdout?.on('data', (chunk: Buffer) => {
      const address = /http:\/\/\S+/.exec(chunk.toString());
      if (address) resolve(address[0]);
    });
  });
}

/** The answer as lines of text. */
function report(answer: RatesAnswer): string[] {
  const largest = Math.max(...answer.bins.map(({ rate }) => rate.value));
  const number = (value: number): string => (value === 0 ? '0' : value.toPrecision(4)).padStart(10);
  const bins = answer.bins.map(({ electrons, energy, rate }) => {
    const range = `${energy.from.toFixed(2)} – ${energy.to.toFixed(2)}`.padStart(15);
    const bar = '█'.repeat(Math.round((rate.value / largest) * BAR_WIDTH));
    return `  ${String(electrons).padStart(9)}  ${range}  ${number(rate.value)}  ${rate.relativeError.toExponential(0).padStart(8)}  ${bar}`;
  });
  const exposure = answer.exposure;
  const needed = exposure?.needed;
  const conclusion =
    exposure && needed
      ? `Exposure for 90 % exclusion if nothing is seen: ${needed.value.toPrecision(4)} kg yr = ${(needed.value * 1e3).toPrecision(4)} g yr` +
        ` (${exposure.expectedSignal?.toPrecision(4)} events expected).`
      : 'No exposure reaches the goal.';
  return [
    'Silicon, two electrons or more, a 10 MeV particle with a heavy mediator, reference cross section 1e-41 cm^2.',
    '',
    `  electrons       energy, eV   1/(kg yr)  rel.err.`,
    ...bins,
    '',
    conclusion,
    '',
    ...answer.notices.map(({ detail }) => `Note: ${detail}`),
  ];
}

const dataDir = fs.mkdtempSync(path.join(os.tmpdir(), 'gramyear-demo-'));
const main = fileURLToPath(new URL('./main.js', import.meta.url));
const service = spawn(process.execPath, [main], {
  env: { ...process.env, HOST: '127.0.0.1', PORT: '0', DATA_DIR: dataDir, LOG_LEVEL: 'warn' },
  stdio: ['ignore', 'pipe', 'inherit'],
});
try {
  const address = await addressOf(service);
  const response = await fetch(`${address}/v1/rates`, {
    method: 'POST',
    headers: { 'Content-Type': 'application/json' },
    body: JSON.stringify(QUESTION),
  });
  if (!response.ok) throw new Error(await response.text());
  process.stdout.write(`${report((await response.json()) as RatesAnswer).join('\n')}\n`);
} catch (error) {
  process.stderr.write(`The demo failed: ${(error as Error).message}\n`);
  process.exitCode = 1;
} finally {
  service.removeAllListeners('exit');
  service.kill('SIGTERM');
  fs.rmSync(dataDir, { recursive: true, force: true });
}
