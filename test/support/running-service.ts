/** The built service as its own process: dist/service/main.js on a free port, its tables in a folder that is thrown away. */
import { type ChildProcess, spawn } from 'node:child_process';
import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { fileURLToPath } from 'node:url';

const MAIN = fileURLToPath(new URL('../../dist/service/main.js', import.meta.url));
/** Long enough for a loaded machine to start a process; what hangs longer has failed. */
const START_MS = 30_000;

export interface Exit {
  readonly code: number | null;
  readonly signal: NodeJS.Signals | null;
}

export interface RunningService {
  readonly url: string;
  readonly pid: number;
  readonly dataDir: string;
  readonly stdout: () => string;
  readonly stderr: () => string;
  readonly exited: Promise<Exit>;
  kill(signal: NodeJS.Signals): void;
  post(path: string, body: unknown, init?: RequestInit): Promise<Response>;
  get(path: string, init?: RequestInit): Promise<Response>;
  /** Ends it and waits for its end. */
  stop(): Promise<void>;
}

export function temporaryFolder(): string {
  return fs.mkdtempSync(path.join(os.tmpdir(), 'gramyear-test-'));
}

function launch(environment: Record<string, string>) {
  const child: ChildProcess = spawn(process.execPath, [MAIN], {
    env: { PATH: process.env['PATH'] ?? '', PORT: '0', LOG_LEVEL: 'error', ...environment },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  const text = { stdout: '', stderr: '' };
  for (const name of ['stdout', 'stderr'] as const) {
    child[name]!.setEncoding('utf8').on('data', (piece: string) => {
      text[name] += piece;
    });
  }
  const exited = new Promise<Exit>((resolve) => {
    child.on('close', (code, signal) => resolve({ code, signal }));
  });
  return { child, text, exited };
}

/** Runs the service to its end, for starts that must fail. */
export async function runToEnd(
  environment: Record<string, string>,
): Promise<Exit & { stdout: string; stderr: string }> {
  const dataDir = temporaryFolder();
  const { child, text, exited } = launch({ DATA_DIR: dataDir, ...environment });
  const timer = setTimeout(() => child.kill('SIGKILL'), START_MS);
  const exit = await exited;
  clearTimeout(timer);
  fs.rmSync(dataDir, { recursive: true, force: true });
  return { ...exit, ...text };
}

export async function startRunningService(environment: Record<string, string> = {}): Promise<RunningService> {
  const dataDir = environment['DATA_DIR'] ?? temporaryFolder();
  const { child, text, exited } = launch({ ...environment, DATA_DIR: dataDir });
  const url = await new Promise<string>((resolve, reject) => {
    const fail = (why: string): void => {
      child.kill('SIGKILL');
      reject(new Error(`the service ${why}\n${text.stdout}${text.stderr}`));
    };
    const timer = setTimeout(() => fail('did not start'), START_MS);
    child.stdout!.on('data', () => {
      const match = /(http:\/\/\S+)\n/.exec(text.stdout);
      if (!match) return;
      clearTimeout(timer);
      resolve(match[1]);
    });
    void exited.then(({ code }) => {
      clearTimeout(timer);
      fail(`ended with ${code}`);
    });
  });
  const json = (body: unknown): string => (typeof body === 'string' ? body : JSON.stringify(body));
  return {
    url,
    pid: child.pid!,
    dataDir,
    stdout: () => text.stdout,
    stderr: () => text.stderr,
    exited,
    kill: (signal) => void child.kill(signal),
    get: (where, init) => fetch(url + where, init),
    post: (where, body, init = {}) =>
      fetch(url + where, {
        method: 'POST',
        body: json(body),
        ...init,
        headers: { 'content-type': 'application/json', ...init.headers },
      }),
    async stop() {
      child.kill('SIGKILL');
      await exited;
      if (environment['DATA_DIR'] === undefined) fs.rmSync(dataDir, { recursive: true, force: true });
    },
  };
}
