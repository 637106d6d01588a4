/** Runs the service: `npm start`. Beside the demo and the nightly job the only file that acts when it is loaded. */
import type { Server } from 'node:http';
import { serve } from '@hono/node-server';
import { type Config, ConfigError, configOf } from './config.ts';
import { createLog } from './log.ts';
import { type Service, startService } from './start.ts';

/** What is in flight may take this long after SIGTERM. */
const LONGEST_DRAIN_MS = 30_000;

let draining = false;
let running: { readonly service: Service; readonly server: Server } | undefined;

/** On SIGTERM, which may come twice or during the start: no new work, what is in flight finishes, exit 0. */
function drain(): void {
  if (draining) return;
  draining = true;
  setTimeout(() => process.exit(1), LONGEST_DRAIN_MS).unref();
  if (running) stop(running);
}

function stop({ service, server }: NonNullable<typeof running>): void {
  service.drain();
  server.close(() => {
    void service.close().then(() => process.exit(0));
  });
  // one that was busy when the signal came is idle as soon as it is answered
  setInterval(() => server.closeIdleConnections(), 50).unref();
}

for (const signal of ['SIGTERM', 'SIGINT'] as const) process.on(signal, drain);

let config: Config;
try {
  config = configOf(process.env);
} catch (error) {
  if (!(error instanceof ConfigError)) throw error;
  process.stderr.write(`gramyear cannot start:\n${error.message}\n`);
  process.exit(2);
}

const service = await startService(config, createLog(config.logLevel));
const server = serve({ fetch: service.app.fetch, hostname: config.host, port: config.port }, (address) => {
  const host = address.family === 'IPv6' ? `[${address.address}]` : address.address;
  process.stdout.write(`gramyear listens on http://${host}:${address.port}\n`);
}) as Server;
running = { service, server };

server.on('error', (error: NodeJS.ErrnoException) => {
  process.stderr.write(`gramyear cannot listen on ${config.host}:${config.port}: ${error.code ?? error.message}\n`);
  process.exit(1);
});
server.on('request', (_request, response) => {
  if (draining && !response.headersSent) response.setHeader('Connection', 'close');
});
if (draining) stop(running);
