/** Structured logs, one JSON object a line, on standard error. */
import { pino } from 'pino';

export type Log = Pick<pino.Logger, 'info' | 'warn' | 'error' | 'fatal'>;

export function createLog(level: string): Log {
  return pino({ level, base: null }, pino.destination(2));
}
