/** Bytes of a request body → validated input. Small ones on the event loop, large ones in a worker thread: the same function. */
import { packTables } from '../crystals/matrix.ts';
import { Problem } from '../problem.ts';
import { BODIES, type BodyName } from '../schemas/bodies.ts';
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
    if (error instanceof Problem) error.namedCrystal = namedCrystal(json);
    throw error;
  }
}

function namedCrystal(json: unknown): string | undefined {
  const id = (json as { crystal?: { id?: unknown } } | null)?.crystal?.id;
  return typeof id === 'string' ? id : undefined;
}

function jsonOf(bytes: Uint8Array): unknown {
  let text: string;
  try {
    text = new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    throw new Problem('malformed-body', 'The body is not UTF-8.');
  }
  if (nestingOf(bytes) > DEEPEST) throw new Problem('malformed-body', `The body nests deeper than ${DEEPEST} levels.`);
  try {
    return JSON.parse(text);
  } catch (error) {
    throw new Problem(
      'malformed-body',
      `The body is not JSON: ${(error as Error).message.replace(/\s+/g, ' ').slice(0, 200)}`,
    );
  }
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
