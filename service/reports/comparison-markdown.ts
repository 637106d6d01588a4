/** A comparison of two reach curves as Markdown: the verdict in words, then the numbers behind it. */
import type { ComparedPoint, OneSidedPoint, RatioAt, ReachComparison, Side } from '../../physics/reach/comparison.ts';

/** An operation of a JSON Patch (RFC 6902). */
export interface PatchOperation {
  readonly op: string;
  readonly path: string;
  readonly value?: unknown;
}

export interface ComparisonReport {
  readonly title: string;
  readonly baselineName: string;
  readonly candidateName: string;
  readonly tolerance: number;
  readonly comparison: ReachComparison;
  /** What turns the baseline's scenario into the candidate's. */
  readonly differences: readonly PatchOperation[];
}

const VERDICTS: Record<ReachComparison['verdict'], string> = {
  better: 'reaches further than',
  same: 'reaches as far as',
  worse: 'reaches less far than',
  mixed: 'differs, with gains and losses, from',
};
const REASONS: Record<OneSidedPoint['reason'], string> = {
  unreachable: 'the other side does not reach this mass',
  undecided: 'the other side ends between its masses here',
  outside: 'outside the masses of the other side',
};

export function comparisonMarkdown(report: ComparisonReport): string {
  const { title, comparison, differences } = report;
  return [
    `# ${inline(title)}`,
    verdictSentence(report),
    ...largestSentences(comparison),
    ...rangeSentences(comparison),
    ...differenceSection(differences),
    ...pointSection(comparison.points),
    ...oneSidedSection('baseline', comparison.onlyBaseline),
    ...oneSidedSection('candidate', comparison.onlyCandidate),
  ]
    .join('\n\n')
    .concat('\n');
}

function verdictSentence({ baselineName, candidateName, tolerance, comparison }: ComparisonReport): string {
  const names = [`The candidate (${inline(candidateName)})`, `the baseline (${inline(baselineName)})`];
  if (comparison.knownPoints === 0) return `**${comparison.verdict}**: no mass at which both curves are known.`;
  return (
    `**${comparison.verdict}**: ${names[0]} ${VERDICTS[comparison.verdict]} ${names[1]}, ` +
    `at a tolerance of ${number(100 * tolerance)} %.`
  );
}

function largestSentences({ largest: { gain, loss } }: ReachComparison): string[] {
  const at = (name: string, found: RatioAt | null): string[] =>
    found ? [`- Largest ${name}: ratio ${number(found.ratio)} at ${number(found.massMev)} MeV`] : [];
  const lines = [...at('gain', gain), ...at('loss', loss)];
  return lines.length > 0 ? [lines.join('\n')] : [];
}

function rangeSentences({ commonRangeMev, interpolatedPoints, points }: ReachComparison): string[] {
  if (!commonRangeMev) return ['The masses of the two curves do not overlap.'];
  const range = `Compared from ${number(commonRangeMev.from)} to ${number(commonRangeMev.to)} MeV at ${points.length} masses`;
  return interpolatedPoints === 0
    ? [`${range}, all of them on both grids.`]
    : [
        `${range}; at ${interpolatedPoints} of them one curve is interpolated (log–log), because its grid does not have them.`,
      ];
}

function differenceSection(differences: readonly PatchOperation[]): string[] {
  if (differences.length === 0) return ['The two scenarios are the same.'];
  const rows = differences.map(({ op, path, value }) => [
    op,
    code(path),
    value === undefined ? '' : code(JSON.stringify(value)),
  ]);
  return ['## What differs between the scenarios', table(['change', 'where', 'value of the candidate'], rows)];
}

function pointSection(points: readonly ComparedPoint[]): string[] {
  if (points.length === 0) return [];
  const rows = points.map(({ massMev, baselineCm2, candidateCm2, ratio, interpolated }) => [
    number(massMev),
    number(baselineCm2),
    number(candidateCm2),
    number(ratio),
    interpolated ?? '',
  ]);
  const names = ['mass (MeV)', 'baseline (cm²)', 'candidate (cm²)', 'ratio candidate/baseline', 'interpolated'];
  return ['## Points', table(names, rows)];
}

function oneSidedSection(side: Side, points: readonly OneSidedPoint[]): string[] {
  if (points.length === 0) return [];
  const rows = points.map(({ massMev, crossSectionCm2, reason }) => [
    number(massMev),
    number(crossSectionCm2),
    REASONS[reason],
  ]);
  return [`## Only the ${side}`, table(['mass (MeV)', 'cross section (cm²)', 'why'], rows)];
}

function table(names: readonly string[], rows: readonly (readonly string[])[]): string {
  const row = (cells: readonly string[]): string => `| ${cells.join(' | ')} |`;
  return [row(names), row(names.map(() => '---')), ...rows.map(row)].join('\n');
}

/** Five digits: finer than any tolerance that makes sense, and a table that can be read. */
function number(value: number | null): string {
  return value === null ? '–' : String(Number(value.toPrecision(5)));
}

/** Text of others in a line or a cell: no markup, no HTML, no line breaks. */
function inline(text: string): string {
  return text
    .replace(/[\p{Cc}\u2028\u2029]+/gu, ' ')
    .replace(/[&<>]/g, (character) => ({ '&': '&amp;', '<': '&lt;', '>': '&gt;' })[character]!)
    .replace(/[\\`*_[\]()|#~!]/g, '\\$&');
}

/** Code that may hold backticks, and bars also in a cell of a table. */
function code(text: string): string {
  const flat = text.replace(/[\p{Cc}\u2028\u2029]+/gu, ' ').replaceAll('|', '\\|');
  const fence = '`'.repeat(1 + Math.max(0, ...[...flat.matchAll(/`+/g)].map(([run]) => run.length)));
  const pad = /^`|`$|^$/.test(flat) ? ' ' : '';
  return fence + pad + flat + pad + fence;
}
