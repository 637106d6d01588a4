/** The application: routes and what all of them share. Opens no port, reads no file. */
import { type Context, Hono } from 'hono';
import { cors } from 'hono/cors';
import { HTTPException } from 'hono/http-exception';
import { methodNotAllowed } from 'hono/method-not-allowed';
import { requestId } from 'hono/request-id';
import { DomainError } from '../physics/errors.ts';
import { type CrystalUploads, crystalUploads, isMultipart } from './crystals/upload/crystal-uploads.ts';
import { type DocsPage, docsRoutes } from './docs-page.ts';
import type { Log } from './log.ts';
import { type Fault, invalidInput, Problem, pointerOf, problemResponse } from './problem.ts';
import { type BodyReader, bodyReader } from './request-body.ts';
import { unknownCrystal } from './resolve-scenario.ts';
import type { Dependencies, RouteDefinition } from './route.ts';
import { ROUTES } from './routes/index.ts';

export interface AppOptions extends Dependencies {
  readonly log: Log;
  readonly deadlineSeconds: number;
  readonly corsOrigins: readonly string[];
  /** The OpenAPI document, as text. */
  readonly document: string;
  readonly docs: DocsPage;
}

const METHODS = ['GET', 'HEAD', 'POST', 'DELETE'];
const EXPOSED_HEADERS = ['Location', 'ETag', 'Retry-After', 'Server-Timing', 'X-Request-Id'];
/** What a file system answers when it cannot or must not be written. */
const STORAGE_CODES = new Set([
  'ENOSPC',
  'EDQUOT',
  'EROFS',
  'EACCES',
  'EPERM',
  'EIO',
  'EMFILE',
  'ENFILE',
  'ENOTDIR',
  'EEXIST',
]);

export function createApp(options: AppOptions): Hono {
  const app = new Hono();
  const bodies = bodyReader(options.compute);
  const uploads = crystalUploads(options.uploadFolder, options.compute);
  app.use(requestId());
  app.use(async (c, next) => {
    await next();
    c.header('X-Request-Id', c.get('requestId')); // again: an error's response is a new one
    c.header('X-Content-Type-Options', 'nosniff');
    if (!c.res.headers.has('Cache-Control')) c.header('Cache-Control', 'no-store');
  });
  if (options.corsOrigins.length > 0)
    app.use(
      cors({
        origin: options.corsOrigins.includes('*') ? '*' : [...options.corsOrigins],
        allowMethods: METHODS,
        exposeHeaders: EXPOSED_HEADERS,
      }),
    );
  app.use(
    methodNotAllowed({
      app,
      onMethodNotAllowed: (_c, methods) => {
        const allowed = methods.join(', ');
        return problemResponse(new Problem('method', `This takes ${allowed}.`, [], { Allow: allowed }));
      },
    }),
  );
  for (const route of ROUTES) register(app, route, options, bodies, uploads);
  docsRoutes(app, options.docs, options.document);
  app.notFound(() =>
    problemResponse(new Problem('not-found', 'There is nothing at this path; GET /docs describes the service.')),
  );
  app.onError((error, c) => problemResponse(problemOf(error, c, options)));
  return app;
}

function register(
  app: Hono,
  route: RouteDefinition,
  options: AppOptions,
  bodies: BodyReader,
  uploads: CrystalUploads,
): void {
  app.on(route.method.toUpperCase(), route.path.replaceAll(/\{(\w+)\}/g, ':$1'), async (c) => {
    if (route.body && !options.isReady())
      throw new Problem('busy', 'The service is shutting down and takes no new work.', [], { 'Retry-After': '1' });
    const signalOf = (): AbortSignal =>
      AbortSignal.any([c.req.raw.signal, AbortSignal.timeout(options.deadlineSeconds * 1e3)]);
    if (route.multipart && isMultipart(c)) {
      const body = await uploads.read(c, signalOf);
      return route.handle({ c, dependencies: options, body: body as never, signal: signalOf() });
    }
    const signal = signalOf();
    const body = route.body && (await readBody(c, route, options, bodies, signal));
    return route.handle({ c, dependencies: options, body: body as never, signal });
  });
}

/** The body; where it is faulty and names a table, a table that does not exist is one more fault. */
async function readBody(
  c: Context,
  route: RouteDefinition,
  options: AppOptions,
  bodies: BodyReader,
  signal: AbortSignal,
): Promise<unknown> {
  try {
    return await bodies.read(c, route.body!, signal, route.multipart ? ['multipart/form-data'] : []);
  } catch (error) {
    if (!(error instanceof Problem)) throw error;
    const unknown: Fault[] = [];
    for (const { pointer, id } of error.namedCrystals) {
      const told = error.faults.some((fault) => fault.pointer === pointer);
      if (!told && !(await options.crystals.find(id))) unknown.push(unknownCrystal(pointer, id));
    }
    // first, so that the cut of a long list does not take them away
    throw unknown.length > 0 ? invalidInput([...unknown, ...error.faults], error.faultCount + unknown.length) : error;
  }
}

/** What the caller may know of an error. The unknown says nothing to the caller and everything to the log. */
function problemOf(error: Error, c: Context, { log, deadlineSeconds }: AppOptions): Problem {
  if (error instanceof Problem) return error;
  if (error instanceof DomainError && isOfInput(error)) return invalidInput([faultOf(error)]);
  if (error.name === 'TimeoutError')
    return new Problem('busy', `The computation took longer than ${deadlineSeconds} s.`, [], { 'Retry-After': '5' });
  if (c.req.raw.signal.aborted) return new Problem('busy', 'The connection was closed.');
  if (error instanceof HTTPException && error.status < 500)
    return new Problem('malformed-body', 'The request cannot be read.');
  log.error({ err: error, requestId: c.get('requestId'), path: c.req.path }, 'request failed');
  if (STORAGE_CODES.has((error as NodeJS.ErrnoException).code ?? '')) {
    return new Problem(
      'storage-full',
      'The disk refused the table: it is full, read-only or out of reach. Nothing was stored; rates go on.',
    );
  }
  return new Problem('internal', 'Something went wrong; the request id tells the operator where to look.');
}

/** Where the parameters of the calculation stand in a scenario. */
const POINTERS: Readonly<Record<string, string>> = {
  mass: '/darkMatter/mass',
  'mediator mass': '/darkMatter/mediator/mass',
  referenceCrossSection: '/darkMatter/referenceCrossSection',
  massSplitting: '/darkMatter/massSplitting',
  localDensity: '/halo/localDensity',
  circularSpeed: '/halo/circularSpeed',
  escapeSpeed: '/halo/escapeSpeed',
  laboratorySpeed: '/halo/laboratorySpeed',
  bandGap: '/ionization/bandGap',
  energyPerPair: '/ionization/energyPerPair',
};

/** Whether an error of the calculation is about something the caller wrote; else it is ours, and goes to the log. */
function isOfInput(error: DomainError): boolean {
  return error.parameter.join('/') in POINTERS || ['backgrounds', 'crystal'].includes(String(error.parameter[0]));
}

function faultOf(error: DomainError): Fault {
  return {
    pointer: POINTERS[error.parameter.join('/')] ?? pointerOf(error.parameter),
    detail: `must be ${error.allowed}; got ${/^(?:-?Infinity|NaN)$/.test(String(error.value)) ? 'one beyond all that can be held' : String(error.value)}`,
  };
}
