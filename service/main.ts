/** Runs the service: `npm start`. The only file that acts when it is loaded. */
import type { Server } from 'node:http';
import { serve } from '@hono/node-server';
import { type Config, ConfigError, configOf } from './config.ts';
import { createLog } from './log.ts';
import { startService } from './start.ts';

/** What is in flight may take this long after SIGTERM. */
const LONGEST_DRAIN_MS = 30_000;

let config: Config;
try {
  config = configOf(process.env);
} catch (error) {
  if (!(error instanceof ConfigError)) throw error;
  process.stderr.write(`gramyear cannot start:\n${error.message}\n`);
  process.exit(2);
}

const log = createLog(config.logLevel);
const service = await startService(config, log);
let draining = false;

const server = serve({ fetch: service.app.fetch, hostname: config.host, port: config.port }, (address) => {
  const host = address.family === 'IPv6' ? `[${address.address}]` : address.address;
  process.stdout.write(`gramyear listens on http://${host}:${address.port}\n`);
}) as Server;

server.on('error', (error: NodeJS.ErrnoException) => {
  process.stderr.write(`gramyear cannot listen on ${config.host}:${config.port}: ${error.code ?? error.message}\n`);
  process.exit(1);
});
server.on('request', (_request, response) => {
  if (draining && !response.headersSent) response.setHeader('Connection', 'close');
});

function drain(): void {
  if (draining) return;
  draining = true;
  service.drain();
  server.close(() => {
    void service.close().then(() => process.exit(0));
  });
  server.closeIdleConnections();
  setTimeout(() => process.exit(1), LONGEST_DRAIN_MS).unref();
}

for (const signal of ['SIGTERM', 'SIGINT'] as const) process.on(signal, drain);
