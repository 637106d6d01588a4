/** Configuration: a pure function of the environment that reports every fault at once. */
import { availableParallelism } from 'node:os';

export interface Config {
  readonly host: string;
  readonly port: number;
  readonly dataDir: string;
  readonly deadlineSeconds: number;
  readonly corsOrigins: readonly string[];
  readonly workers: number;
  readonly queue: number;
  readonly tableCacheMib: number;
  readonly logLevel: string;
}

export class ConfigError extends Error {}

const LOG_LEVELS = ['fatal', 'error', 'warn', 'info', 'debug', 'silent'];

/** Reads the variables the README lists; throws ConfigError with a line for each fault. */
export function configOf(environment: Readonly<Record<string, string | undefined>>): Config {
  const faults: string[] = [];
  const number = (name: string, fallback: number, least: number, most: number, whole = true): number => {
    const text = environment[name];
    if (text === undefined || text === '') return fallback;
    const value = Number(text);
    if (text.trim() !== '' && value >= least && value <= most && (!whole || Number.isInteger(value))) return value;
    faults.push(`${name}=${text}: must be ${whole ? 'a whole number' : 'a number'} from ${least} to ${most}`);
    return fallback;
  };
  const logLevel = environment['LOG_LEVEL'] || 'info';
  if (!LOG_LEVELS.includes(logLevel)) faults.push(`LOG_LEVEL=${logLevel}: must be one of ${LOG_LEVELS.join(', ')}`);
  const corsOrigins = (environment['CORS_ORIGINS'] ?? '')
    .split(',')
    .map((origin) => origin.trim())
    .filter(Boolean);
  for (const origin of corsOrigins) {
    if (origin !== '*' && !(URL.canParse(origin) && new URL(origin).origin === origin)) {
      faults.push(`CORS_ORIGINS: "${origin}" is not an origin such as https://plots.example.org`);
    }
  }
  const config: Config = {
    host: environment['HOST'] || '127.0.0.1',
    port: number('PORT', 8087, 0, 65_535),
    dataDir: environment['DATA_DIR'] || './data',
    deadlineSeconds: number('DEADLINE_S', 60, 0.01, 86_400, false),
    corsOrigins,
    workers: number('WORKERS', Math.max(1, availableParallelism()), 1, 256),
    queue: number('QUEUE', 256, 0, 100_000),
    tableCacheMib: number('TABLE_CACHE_MIB', 512, 1, 1_000_000),
    logLevel,
  };
  if (faults.length > 0) throw new ConfigError(faults.join('\n'));
  return config;
}
