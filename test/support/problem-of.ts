/** Reads an answer as a problem, checking what every problem must have. */
import { expect } from 'vitest';

export interface ProblemBody {
  readonly type: string;
  readonly title: string;
  readonly status: number;
  readonly detail: string;
  readonly errors?: readonly { readonly pointer?: string; readonly parameter?: string; readonly detail: string }[];
}

const STATUS_OF: Readonly<Record<string, number>> = {
  'malformed-body': 400,
  'not-found': 404,
  method: 405,
  'not-acceptable': 406,
  'in-use': 409,
  'too-large': 413,
  'media-type': 415,
  'invalid-input': 422,
  internal: 500,
  busy: 503,
  'storage-full': 507,
};

/** The problem, if it is one of this type with all that the contract asks of a problem. */
export async function problemOf(response: Response, type: string): Promise<ProblemBody> {
  const text = await response.text();
  expect([response.status, response.headers.get('content-type')], text.slice(0, 300)).toEqual([
    STATUS_OF[type],
    'application/problem+json',
  ]);
  expect(text).not.toMatch(/NaN|Infinity|\bat .*:\d+:\d+|node_modules|\.[jt]s:\d/);
  expect(response.headers.get('x-request-id')).toMatch(/^[\w-]+$/);
  expect(response.headers.get('cache-control')).toBe('no-store');
  const problem = JSON.parse(text) as ProblemBody;
  expect(problem).toMatchObject({ type: `/problems/${type}`, status: STATUS_OF[type] });
  expect(problem.title).not.toBe('');
  expect(problem.detail).not.toBe('');
  return problem;
}

/** Pointers of the faults of a 422, in order. */
export async function pointersOf(response: Response): Promise<(string | undefined)[]> {
  const { errors = [] } = await problemOf(response, 'invalid-input');
  for (const { detail } of errors) expect(detail.length).toBeGreaterThan(0);
  return errors.map(({ pointer }) => pointer);
}
