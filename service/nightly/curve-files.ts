/** The files of one curve: the answer, and what a reader wants to see of it and of the reference behind it. */
import { reachFigure } from '../figure/reach-figure.ts';
import { comparisonCsv } from '../reports/comparison-csv.ts';
import { comparisonMarkdown } from '../reports/comparison-markdown.ts';
import { reachCsv } from '../reports/reach-csv.ts';
import type { NightCurve } from './changed-inputs.ts';
import { causesInWords, type NightComparison, verdictInWords } from './compare-night.ts';
import { markdownText } from './markdown-text.ts';
import type { PlannedCurve } from './plan.ts';
import { bandEdgesOf, curveOf, type NightlyReach } from './reach-answer.ts';

export interface CurveToWrite {
  readonly curve: PlannedCurve;
  readonly run: string;
  readonly answer: NightlyReach;
  readonly reference?: { readonly run: string; readonly curve: NightCurve; readonly compared: NightComparison };
}

export type CurveFiles = Readonly<Record<'json' | 'csv' | 'markdown' | 'svg', string>> & {
  readonly comparisonCsv?: string;
};

export function fileNames(stem: string, hasReference: boolean): CurveFiles {
  return {
    json: `${stem}.json`,
    csv: `${stem}.csv`,
    markdown: `${stem}.md`,
    svg: `${stem}.svg`,
    ...(hasReference ? { comparisonCsv: `${stem}.comparison.csv` } : {}),
  };
}

/** Texts under the same keys as the names. */
export function fileTexts(written: CurveToWrite): CurveFiles {
  const { answer, reference } = written;
  return {
    json: `${JSON.stringify(answer)}\n`,
    csv: reachCsv(answer.points.map(rowOf)),
    markdown: markdownOf(written),
    svg: figureOf(written),
    ...(reference ? { comparisonCsv: comparisonCsv(reference.compared.comparison) } : {}),
  };
}

function rowOf({ mass, crossSection, expectedSignal, expectedBackground }: NightlyReach['points'][number]) {
  return {
    massMev: mass.value,
    crossSectionCm2: crossSection?.value ?? null,
    relativeError: crossSection?.relativeError,
    expectedSignal,
    expectedBackground,
  };
}

function figureOf({ curve, run, answer, reference }: CurveToWrite): string {
  const edges = bandEdgesOf(answer);
  return reachFigure({
    title: curve.name,
    subtitle: reference ? `Run ${run}; behind it the reference, run ${reference.run}` : `Run ${run}; no reference yet`,
    curves: [{ name: 'tonight', points: curveOf(answer), lightestMassMev: answer.lightestMass?.value }],
    references: reference ? [{ name: 'reference', points: curveOf(reference.curve.answer) }] : [],
    band: edges && {
      name: 'lowest to highest of the tables',
      points: edges.lowest.map(({ massMev, crossSectionCm2 }, i) => ({
        massMev,
        lowestCm2: crossSectionCm2,
        highestCm2: edges.highest[i].crossSectionCm2,
      })),
    },
  });
}

function markdownOf({ curve, run, answer, reference }: CurveToWrite): string {
  if (!reference) return firstMarkdown(curve, run, answer);
  const { compared } = reference;
  const text = comparisonMarkdown({
    title: curve.name,
    baselineName: `reference, run ${reference.run}`,
    candidateName: `tonight, run ${run}`,
    tolerance: curve.tolerance,
    comparison: compared.comparison,
    differences: compared.differences,
  });
  // what did it comes right after the title and the verdict, before the long tables
  const [title, verdict, ...tables] = text.trimEnd().split('\n\n');
  const heading = compared.moved ? '## What moved it' : '## What changed, and moved nothing';
  const causes = causesInWords(compared).map((words) => `- ${markdownText(words)}`);
  const patch = compared.differences.length > 0 ? ['## As a JSON Patch', indented(compared.differences)] : [];
  const own = [markdownText(verdictInWords(compared)), heading, causes.join('\n')];
  return [title, verdict, ...own, ...tables, ...patch].join('\n\n').concat('\n');
}

/** As a block of code that nothing inside can end. */
function indented(value: unknown): string {
  return JSON.stringify(value, undefined, 2).replaceAll(/^/gm, '    ');
}

function firstMarkdown({ name }: PlannedCurve, run: string, answer: NightlyReach): string {
  const rows = curveOf(answer).map(
    ({ massMev, crossSectionCm2 }) =>
      `| ${digits(massMev)} | ${crossSectionCm2 === null ? 'not reached' : digits(crossSectionCm2)} |`,
  );
  return [
    `# ${markdownText(name)}`,
    `Run ${run}; no reference yet.`,
    ['| mass (MeV) | cross section (cm²) |', '| --- | --- |', ...rows].join('\n'),
    '',
  ].join('\n\n');
}

function digits(value: number): string {
  return String(Number(value.toPrecision(5)));
}
