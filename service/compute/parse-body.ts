/** Bytes of a request body → validated input. Small ones on the event loop, large ones in a worker thread: the same function. */
import { packTables } from '../crystals/matrix.ts';
import { type NamedCrystal, Problem, pointerOf } from '../problem.ts';
import { BODIES, type BodyName } from '../schemas/bodies.ts';
import { scenarioPlaces } from '../schemas/scenario-places.ts';
import { parseInput } from '../validation.ts';

export interface ParseJob {
  readonly body: BodyName;
  readonly bytes: Uint8Array;
}

/** Nothing in the contract nests deeper than this by far. */
const DEEPEST = 32;

export function parseBody({ body, bytes }: ParseJob): unknown {
  const json = jsonOf(bytes);
  packTables(json);
  try {
    return parseInput(BODIES[body], json);
  } catch (error) {
    if (error instanceof Problem) error.namedCrystals = namedCrystals(json);
    throw error;
  }
}

function namedCrystals(json: unknown): NamedCrystal[] {
  return scenarioPlaces(json).flatMap(({ path, scenario }) => {
    const { crystal } = scenario;
    const at = [...path, 'crystal'];
    const named = Array.isArray(crystal)
      ? crystal.map((one: unknown, i) => ({ one, at: [...at, i] }))
      : [{ one: crystal, at }];
    return named.flatMap(({ one, at: place }) => {
      const id = (one as { id?: unknown } | null | undefined)?.id;
      return typeof id === 'string' ? [{ pointer: pointerOf([...place, 'id']), id }] : [];
    });
  });
}

/** JSON out of bytes; `what` names them where they are none. */
export function jsonOf(bytes: Uint8Array, what = 'body'): unknown {
  let text: string;
  try {
    text = new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    throw new Problem('malformed-body', `The ${what} is not UTF-8.`);
  }
  if (nestingOf(bytes) > DEEPEST)
    throw new Problem('malformed-body', `The ${what} nests deeper than ${DEEPEST} levels.`);
  try {
    return JSON.parse(text);
  } catch (error) {
    throw new Problem('malformed-body', `The ${what} is not JSON: ${reasonOf(error as SyntaxError)}.`);
  }
}

/** What the parser found, without the piece of the body that it quotes. */
function reasonOf({ message }: SyntaxError): string {
  return message.replace(/, (?:\.\.\.)?".*$/s, '').slice(0, 100);
}

/** Deepest nesting of brackets outside strings; stops counting once it is too deep. */
function nestingOf(bytes: Uint8Array): number {
  const [quote, backslash] = [0x22, 0x5c];
  let deepest = 0;
  let depth = 0;
  let inString = false;
  for (let i = 0; i < bytes.length && deepest <= DEEPEST; i++) {
    const byte = bytes[i];
    if (inString) {
      if (byte === backslash) i++;
      else if (byte === quote) inString = false;
    } else if (byte === quote) inString = true;
    else if (byte === 0x5b || byte === 0x7b) deepest = Math.max(deepest, ++depth);
    else if (byte === 0x5d || byte === 0x7d) depth--;
  }
  return deepest;
}
