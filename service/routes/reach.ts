import type { Context } from 'hono';
import { reachFigure } from '../figure/reach-figure.ts';
import { type ReachCurve, reachCurve } from '../reach.ts';
import { reachCsvHeader, reachCsvRow } from '../reports/reach-csv.ts';
import { defineRoute, negotiate } from '../route.ts';
import { ReachAnswer, type ReachPointOut, type ReachSummary } from '../schemas/reach.ts';

const MEDIA_TYPES = ['application/json', 'application/x-ndjson', 'text/csv', 'image/svg+xml'];

export const reach = defineRoute({
  method: 'post',
  path: '/v1/reach',
  operationId: 'computeReach',
  tag: 'reach',
  summary: 'The smallest cross section an exposure tests, mass by mass',
  description:
    'For each mass the smallest σ̄ₑ for which the scenario’s goal holds at the exposure. As JSON; as NDJSON, a line a point as it is ' +
    'computed and a last line with the rest; as CSV; or as a figure (image/svg+xml). A list of tables in place of one gives a band.',
  body: 'reach',
  examples: {
    silicon: {
      summary: '100 g yr of silicon, two electrons, 90 % exclusion without background',
      value: {
        scenario: {
          darkMatter: { mediator: 'heavy' },
          crystal: { id: 'silicon' },
          goal: { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 15 } },
        },
        exposure: '100 g yr',
        masses: { from: '1 MeV', to: '1 GeV', count: 7 },
      },
    },
    band: {
      summary: 'What screening does to the reach, at three masses',
      value: {
        scenario: {
          darkMatter: { mediator: 'light' },
          crystal: [{ id: 'silicon' }, { id: 'silicon-unscreened' }],
          goal: { kind: 'events', count: 3, window: { from: 2, to: 10 } },
        },
        exposure: '1 kg yr',
        masses: { unit: 'MeV', values: [2, 10, 50] },
      },
    },
  },
  responses: { 200: { description: 'The curve.', schema: ReachAnswer, otherMediaTypes: MEDIA_TYPES.slice(1) } },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies, signal }) {
    const mediaType = negotiate(c, MEDIA_TYPES);
    const began = performance.now();
    const curve = await reachCurve(body, dependencies, signal);
    // the first point before the answer begins: what can be refused is refused with a status
    const points = curve.points[Symbol.asyncIterator]();
    const first = await points.next();
    const all = rest(first, points);
    if (mediaType === 'application/x-ndjson')
      return streamed(
        c,
        mediaType,
        all,
        (point) => `${JSON.stringify(point)}\n`,
        () => `${JSON.stringify(curve.summary())}\n`,
      );
    if (mediaType === 'text/csv')
      return streamed(c, `${mediaType}; charset=utf-8; header=present`, prefixed(all), csvRowOf);
    const collected: ReachPointOut[] = [];
    for await (const point of all) collected.push(point);
    const summary = curve.summary();
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    if (mediaType === 'image/svg+xml') return c.body(figureOf(collected, summary), 200, { 'Content-Type': mediaType });
    return c.json({ points: collected, ...summary });
  },
});

type Points = ReturnType<ReachCurve['points'][typeof Symbol.asyncIterator]>;

async function* rest(first: IteratorResult<ReachPointOut>, points: Points): AsyncGenerator<ReachPointOut> {
  for (let at = first; !at.done; at = await points.next()) yield at.value;
}

/** Header first, as a row of its own. */
async function* prefixed(points: AsyncIterable<ReachPointOut>): AsyncGenerator<ReachPointOut | undefined> {
  yield undefined;
  yield* points;
}

function csvRowOf(point: ReachPointOut | undefined): string {
  if (!point) return reachCsvHeader();
  const { mass, crossSection, expectedSignal, expectedBackground } = point;
  return reachCsvRow({
    massMev: mass.value,
    crossSectionCm2: crossSection?.value ?? null,
    relativeError: crossSection?.relativeError,
    expectedSignal,
    expectedBackground,
  });
}

/** Sends rows as they come. A failure in the middle breaks the connection off: a status can no longer say it. */
function streamed<T>(
  c: Context,
  mediaType: string,
  rows: AsyncIterable<T>,
  textOf: (row: T) => string,
  last?: () => string,
): Response {
  const encoder = new TextEncoder();
  async function* bytes(): AsyncGenerator<Uint8Array> {
    for await (const row of rows) yield encoder.encode(textOf(row));
    if (last) yield encoder.encode(last());
  }
  return c.body(ReadableStream.from(bytes()), 200, { 'Content-Type': mediaType });
}

/** The request's own words as title. */
function figureOf(points: readonly ReachPointOut[], { lightestMass, request }: ReachSummary): string {
  const { scenario, exposureKgYr } = request as {
    scenario: { darkMatter: { mediator: { kind: string; massEv?: number } }; goal: { kind: string } };
    exposureKgYr: number;
  };
  const { mediator } = scenario.darkMatter;
  const kind =
    mediator.massEv === undefined
      ? `${mediator.kind} mediator`
      : `mediator of ${Number((mediator.massEv / 1e3).toPrecision(4))} keV`;
  const exposure =
    exposureKgYr < 1
      ? `${Number((exposureKgYr * 1e3).toPrecision(4))} g yr`
      : `${Number(exposureKgYr.toPrecision(4))} kg yr`;
  const curve = points.map((point) => ({
    massMev: point.mass.value,
    crossSectionCm2: point.crossSection?.value ?? null,
  }));
  const band = points.some((point) => point.band)
    ? {
        name: 'lowest to highest of the tables',
        points: points.map(({ mass, band: both }) => ({
          massMev: mass.value,
          lowestCm2: both?.lowest?.value ?? null,
          highestCm2: both?.highest?.value ?? null,
        })),
      }
    : undefined;
  return reachFigure({
    title: `Reach of ${exposure}`,
    subtitle: `${kind}, ${scenario.goal.kind}`,
    curves: [{ name: `${exposure}, ${kind}`, points: curve, lightestMassMev: lightestMass?.value }],
    band,
  });
}
