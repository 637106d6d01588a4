/** The words after `npm run nightly --`. */
import { parseArgs } from 'node:util';

export const USAGE = `usage: npm run nightly -- PLAN.json [--url URL] [--accept] [--data DIR] [--quiet]

  --url URL   ask a running service in place of one inside this process
  --accept    make tonight's curves the reference of the nights to come
  --data DIR  in place of DATA_DIR: the history is in DIR/nightly, uploaded tables in DIR (default ./data)
  --quiet     no progress; the result is printed all the same

exit code: 0 nothing moved, 1 something moved beyond its tolerance, 2 could not run
`;

export interface CommandLine {
  readonly planFile: string;
  /** Without a slash at its end. */
  readonly url: string | undefined;
  readonly accept: boolean;
  readonly dataDir: string | undefined;
  readonly quiet: boolean;
}

export class UsageError extends Error {}

/** @returns undefined where help was asked for. @throws UsageError with every fault in its message, a line each. */
export function commandLineOf(words: readonly string[]): CommandLine | undefined {
  const { values, positionals } = parsed(words);
  if (values.help) return undefined;
  const faults: string[] = [];
  if (positionals.length !== 1) faults.push(`one plan file is needed; got ${positionals.length}`);
  if (values.url !== undefined && !isServiceUrl(values.url))
    faults.push(`--url must be like http://127.0.0.1:8087, without user, query or fragment; got ${values.url}`);
  if (values.data === '') faults.push('--data needs a folder');
  if (faults.length > 0) throw new UsageError(faults.join('\n'));
  return {
    planFile: positionals[0],
    url: values.url?.replace(/\/+$/, ''),
    accept: values.accept,
    dataDir: values.data,
    quiet: values.quiet,
  };
}

function parsed(words: readonly string[]) {
  try {
    return parseArgs({
      args: [...words],
      allowPositionals: true,
      options: {
        url: { type: 'string' },
        accept: { type: 'boolean', default: false },
        data: { type: 'string' },
        quiet: { type: 'boolean', default: false },
        help: { type: 'boolean', short: 'h', default: false },
      },
    });
  } catch (error) {
    throw new UsageError((error as Error).message);
  }
}

function isServiceUrl(text: string): boolean {
  if (!URL.canParse(text)) return false;
  const { protocol, username, password, search, hash } = new URL(text);
  return /^https?:$/.test(protocol) && username + password + search + hash === '';
}
