/** Runs the nightly job: `npm run nightly -- plan.json`. Acts when it is loaded; the clock and chance are read here and nowhere else. */
import { randomBytes } from 'node:crypto';
import { nightly, Stopped } from './nightly/command.ts';

const COULD_NOT_RUN = 2;

const stop = new AbortController();
for (const signal of ['SIGTERM', 'SIGINT'] as const) {
  process.on(signal, () => {
    // the second time at once: the history is whole at any moment
    if (stop.signal.aborted) process.exit(COULD_NOT_RUN);
    stop.abort(new Stopped(`stopped by ${signal}; nothing was added to the history`));
  });
}
// Node's own exit code for these, 1, would say that something moved
for (const failure of ['uncaughtException', 'unhandledRejection'] as const) {
  process.on(failure, (error: unknown) => {
    process.stderr.write(`The nightly job failed: ${(error as Error).stack ?? String(error)}\n`);
    process.exit(COULD_NOT_RUN);
  });
}

process.exitCode = await nightly(process.argv.slice(2), {
  environment: process.env,
  stdout: process.stdout,
  stderr: process.stderr,
  now: () => new Date(),
  suffix: () => randomBytes(4).toString('hex'),
  signal: stop.signal,
});
