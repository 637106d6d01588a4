/**
 * Every failure as RFC 9457 `application/problem+json`, built in this one place. A Problem carries facts that the caller may
 * see; anything else that is thrown becomes a bare 500 and goes to the log.
 */

export const PROBLEM_TYPES = {
  'malformed-body': { status: 400, title: 'The body cannot be read' },
  'not-found': { status: 404, title: 'Not found' },
  method: { status: 405, title: 'Method not allowed' },
  'not-acceptable': { status: 406, title: 'No such representation' },
  'in-use': { status: 409, title: 'In use' },
  'too-large': { status: 413, title: 'Too large' },
  'media-type': { status: 415, title: 'Unsupported media type' },
  'invalid-input': { status: 422, title: 'The input is invalid' },
  internal: { status: 500, title: 'Internal error' },
  busy: { status: 503, title: 'Busy' },
  'storage-full': { status: 507, title: 'The table could not be stored' },
} as const;

export type ProblemType = keyof typeof PROBLEM_TYPES;

/** One fault of the input: an RFC 6901 pointer into the body, or the name of a query or path parameter. */
export interface Fault {
  readonly pointer?: string;
  readonly parameter?: string;
  readonly detail: string;
}

/** A table by the id or alias at a pointer of a body. */
export interface NamedCrystal {
  readonly pointer: string;
  readonly id: string;
}

/** Faults listed at most; the detail says how many there were. */
export const MOST_FAULTS = 50;

export class Problem extends Error {
  readonly type: ProblemType;
  readonly faults: readonly Fault[];
  readonly headers: Readonly<Record<string, string>>;
  /** The tables that a faulty body names: whether they exist is told along with the other faults. */
  namedCrystals: readonly NamedCrystal[] = [];
  /** How many faults there were, listed or not. */
  faultCount: number;

  constructor(type: ProblemType, detail: string, faults: readonly Fault[] = [], headers: Record<string, string> = {}) {
    super(detail);
    this.name = 'Problem';
    this.type = type;
    this.faults = faults;
    this.faultCount = faults.length;
    this.headers = headers;
  }
}

/** Bad input, every fault at once; `count` where there were more than are passed. */
export function invalidInput(faults: readonly Fault[], count = faults.length): Problem {
  const shown = faults.slice(0, MOST_FAULTS);
  const words = count === 1 ? '1 fault' : `${count} faults`;
  const cut = count > shown.length ? `, the first ${shown.length} listed` : '';
  return Object.assign(new Problem('invalid-input', `The request has ${words}${cut}.`, shown), { faultCount: count });
}

/** RFC 6901 pointer of a path of keys. */
export function pointerOf(path: readonly PropertyKey[]): string {
  return path.map((key) => `/${String(key).replaceAll('~', '~0').replaceAll('/', '~1')}`).join('');
}

export function problemResponse(problem: Problem): Response {
  const { status, title } = PROBLEM_TYPES[problem.type];
  const body = {
    type: `/problems/${problem.type}`,
    title,
    status,
    detail: problem.message,
    ...(problem.faults.length > 0 ? { errors: problem.faults } : {}),
  };
  return new Response(JSON.stringify(body), {
    status,
    headers: { 'Content-Type': 'application/problem+json', 'Cache-Control': 'no-store', ...problem.headers },
  });
}
