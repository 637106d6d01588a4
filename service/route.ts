/**
 * A route, defined once: its place, what it takes, what it answers and what it does. The application serves it, the OpenAPI
 * document describes it, from the same object.
 */
import type { Context } from 'hono';
import { parseAccept } from 'hono/utils/accept';
import type { z } from 'zod';
import type { Compute } from './compute/compute.ts';
import type { CrystalLibrary } from './crystals/crystal-library.ts';
import type { TableStore } from './crystals/table-store.ts';
import { Problem, type ProblemType } from './problem.ts';
import type { BODIES, BodyName } from './schemas/bodies.ts';
import type { ChargeHeader } from './schemas/charge-table.ts';

export interface Dependencies {
  readonly crystals: CrystalLibrary;
  readonly chargeTables: TableStore<ChargeHeader>;
  readonly compute: Compute;
  readonly version: string;
  /** Where uploads lie while they are read. */
  readonly uploadFolder: string;
  /** Whether the service can take work: its tables are loaded and it is not shutting down. */
  readonly isReady: () => boolean;
}

export interface RouteResponse {
  readonly description: string;
  readonly schema?: z.ZodType;
  readonly mediaType?: string;
  /** Other forms of the same answer, by Accept. */
  readonly otherMediaTypes?: readonly string[];
  readonly headers?: Readonly<Record<string, string>>;
}

export interface Example {
  readonly summary: string;
  readonly value: unknown;
}

export interface MultipartForm {
  readonly description: z.ZodType;
  readonly values: string;
}

export interface HandlerInput<B extends BodyName | undefined> {
  readonly c: Context;
  readonly dependencies: Dependencies;
  readonly body: B extends BodyName ? z.output<(typeof BODIES)[B]> : undefined;
  /** Ends when the caller goes away or the deadline passes. */
  readonly signal: AbortSignal;
}

export interface RouteDefinition<B extends BodyName | undefined = BodyName | undefined> {
  readonly method: 'get' | 'post' | 'delete';
  /** OpenAPI form, /v1/crystals/{id}. */
  readonly path: string;
  readonly operationId: string;
  readonly tag: string;
  readonly summary: string;
  readonly description?: string;
  readonly parameters?: Readonly<Record<string, string>>;
  /** Of each parameter, for which the examples are answered. */
  readonly parameterExamples?: Readonly<Record<string, string>>;
  readonly body?: B;
  /** Another form of the body: a description in JSON and a file. Read by crystals/upload, described to callers here. */
  readonly multipart?: MultipartForm;
  readonly examples?: Readonly<Record<string, Example>>;
  readonly responses: Readonly<Record<number, RouteResponse>>;
  readonly problems: readonly ProblemType[];
  readonly handle: (input: HandlerInput<B>) => Response | Promise<Response>;
}

/** Fixes the type of the body from its name. */
export function defineRoute<B extends BodyName | undefined>(route: RouteDefinition<B>): RouteDefinition {
  return route as unknown as RouteDefinition;
}

/** The first of `offered` that the Accept header allows, by its preferences; a Problem if it allows none. */
export function negotiate(c: Context, offered: readonly string[]): string {
  const header = c.req.header('accept');
  if (!header) return offered[0];
  const wanted = parseAccept(header);
  const qualityOf = (type: string): number => {
    const own = [type, `${type.split('/')[0]}/*`, '*/*'].map((range) =>
      wanted.find((accept) => accept.type.toLowerCase() === range),
    );
    return own.find((accept) => accept !== undefined)?.q ?? 0;
  };
  const best = [...offered].sort((a, b) => qualityOf(b) - qualityOf(a))[0];
  if (qualityOf(best) > 0) return best;
  throw new Problem('not-acceptable', `This answers as ${offered.join(', ')}.`);
}
