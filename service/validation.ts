/** Turning what zod finds wrong with an input into faults: plain RFC 6901 pointers, plain words, every fault at once. */
import type { z } from 'zod';
import { type Fault, invalidInput, pointerOf } from './problem.ts';

interface Found {
  readonly path: readonly PropertyKey[];
  readonly detail: string;
  readonly code: string;
}

type Issue = z.core.$ZodIssue;

/** One issue a leaf: each unknown key by itself; of a union, the faults of the branch that the input was meant for. */
function leaves(issues: readonly Issue[], base: readonly PropertyKey[]): Found[] {
  return issues.flatMap((issue): Found[] => {
    const path = [...base, ...issue.path];
    if (issue.code === 'unrecognized_keys') {
      return issue.keys.map((key) => ({ path: [...path, key], detail: 'is not a known field', code: issue.code }));
    }
    if (issue.code === 'invalid_union') {
      const branches = issue.errors.map((errors) => leaves(errors, path)).filter((found) => !found.some(wrongAt(path)));
      const unknown = (found: Found[]): number => found.filter((f) => f.code === 'unrecognized_keys').length;
      branches.sort((a, b) => unknown(a) - unknown(b) || a.length - b.length);
      if (branches.length > 0) return branches[0];
    }
    return [{ path, detail: plainWords(issue.message), code: issue.code }];
  });
}

/** Whether a fault says that the value at `path` itself is of the wrong kind: then the branch was not the one meant. */
function wrongAt(path: readonly PropertyKey[]) {
  return (fault: Found): boolean =>
    fault.path.length === path.length && ['invalid_type', 'invalid_union', 'invalid_value'].includes(fault.code);
}

function plainWords(message: string): string {
  if (/^Invalid input: expected (?:number|int), received (?:Infinity|NaN)$/.test(message))
    return 'must be a finite number; got one beyond all that can be held';
  const missing = /^Invalid input: expected (.*), received undefined$/.exec(message);
  if (missing) return `is missing; must be ${withArticle(missing[1])}`;
  const wrong = /^Invalid input: expected (.*), received (.*)$/.exec(message);
  if (wrong) return `must be ${withArticle(wrong[1])}; got ${withArticle(wrong[2])}`;
  const option = /^Invalid option: expected one of (.*)$/.exec(message);
  if (option) return `must be one of ${option[1].replaceAll('|', ', ')}`;
  const bound = /^(?:Too small|Too big): expected \w+ to (be|have) (.*)$/.exec(message);
  if (bound) return `must ${bound[1]} ${bound[2].replace(/^(>=|<=|>|<)/, '$1 ')}`;
  return message;
}

function withArticle(noun: string): string {
  if (noun === 'int') return 'a whole number';
  if (noun === 'null' || noun === 'undefined') return noun;
  return /^[aeio]/.test(noun) ? `an ${noun}` : `a ${noun}`;
}

/** What is wrong with a body, as faults. */
export function faultsOf(error: z.ZodError): Fault[] {
  return leaves(error.issues, []).map(({ path, detail }) => ({ pointer: pointerOf(path), detail }));
}

/** The parsed input, or the Problem that lists everything wrong with it. */
export function parseInput<S extends z.ZodType>(schema: S, input: unknown): z.output<S> {
  const result = schema.safeParse(input);
  if (!result.success) throw invalidInput(faultsOf(result.error));
  return result.data;
}
