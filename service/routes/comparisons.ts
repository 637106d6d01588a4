import { compareCurves } from '../compare-curves.ts';
import { reachFigure } from '../figure/reach-figure.ts';
import { comparisonCsv } from '../reports/comparison-csv.ts';
import { comparisonMarkdown } from '../reports/comparison-markdown.ts';
import { defineRoute, negotiate } from '../route.ts';
import { ComparisonAnswer } from '../schemas/comparisons.ts';

const MEDIA_TYPES = ['application/json', 'text/markdown', 'text/csv', 'image/svg+xml'];

const curve = (noise: number) => ({
  scenario: {
    darkMatter: { mediator: 'heavy' },
    crystal: { id: 'silicon' },
    readout: { noise },
    backgrounds: [
      {
        name: 'dark current',
        kind: 'darkCurrent',
        current: '1e-4 1/day',
        pixelMass: '0.35 ug',
        readoutInterval: '2 h',
      },
    ],
    goal: { kind: 'exclusion', confidence: 0.9, window: { from: 2, to: 10 } },
  },
  exposure: '100 g yr',
  masses: { from: '2 MeV', to: '200 MeV', count: 5 },
});

export const comparisons = defineRoute({
  method: 'post',
  path: '/v1/comparisons',
  operationId: 'compareReach',
  tag: 'reach',
  summary: 'What changed between two reach curves',
  description:
    'Each side is a reach request or the answer of one. The ratio per mass on the common range (log–log where the grids differ), the ' +
    'largest gain and loss, what only one side reaches, what differs between the requests, a verdict. JSON, Markdown, CSV, or a figure of both curves by Accept.',
  body: 'comparison',
  examples: {
    noise: { summary: 'A quieter readout', value: { baseline: curve(0.2), candidate: curve(0.15), tolerance: 0.05 } },
    finished: {
      summary: 'Two finished curves, invented',
      value: {
        baseline: {
          points: [
            { mass: { value: 1, unit: 'MeV' }, crossSection: null },
            { mass: { value: 10, unit: 'MeV' }, crossSection: { value: 4e-41, unit: 'cm^2' } },
          ],
        },
        candidate: {
          points: [
            { mass: { value: 1, unit: 'MeV' }, crossSection: null },
            { mass: { value: 10, unit: 'MeV' }, crossSection: { value: 2e-41, unit: 'cm^2' } },
          ],
        },
      },
    },
  },
  responses: {
    200: { description: 'The comparison.', schema: ComparisonAnswer, otherMediaTypes: MEDIA_TYPES.slice(1) },
  },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies, signal }) {
    const mediaType = negotiate(c, MEDIA_TYPES);
    const began = performance.now();
    const { comparison, answer, curves } = await compareCurves(body, dependencies, signal);
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    if (mediaType === 'application/json') return c.json(answer);
    if (mediaType === 'image/svg+xml') {
      return c.body(
        reachFigure({ title: 'Two reach curves', subtitle: `the candidate is: ${answer.verdict}`, curves }),
        200,
        { 'Content-Type': mediaType },
      );
    }
    const text =
      mediaType === 'text/csv'
        ? comparisonCsv(comparison)
        : comparisonMarkdown({
            title: 'Comparison of two reach curves',
            baselineName: 'baseline',
            candidateName: 'candidate',
            tolerance: body.tolerance,
            comparison,
            differences: answer.differences,
          });
    return c.body(text, 200, { 'Content-Type': `${mediaType}; charset=utf-8` });
  },
});
