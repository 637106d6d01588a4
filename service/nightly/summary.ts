/** The night as a whole: as JSON for programs, as Markdown for a report, as lines for a terminal or a log. */
import type { Fault } from '../problem.ts';
import { causesInWords, type NightComparison, verdictInWords } from './compare-night.ts';
import type { CurveFiles } from './curve-files.ts';
import { markdownText } from './markdown-text.ts';
import type { PlannedCurve } from './plan.ts';

export type CurveOutcome =
  | { readonly state: 'new'; readonly curve: PlannedCurve; readonly files: CurveFiles }
  | {
      readonly state: 'same' | 'moved';
      readonly curve: PlannedCurve;
      readonly files: CurveFiles;
      readonly compared: NightComparison;
    }
  | {
      readonly state: 'failed';
      readonly curve: PlannedCurve;
      readonly detail: string;
      readonly faults: readonly Fault[];
    };

export interface Night {
  readonly run: string;
  readonly startedAt: Date;
  readonly service: string;
  readonly reference: string | undefined;
  readonly outcomes: readonly CurveOutcome[];
  /** Curves of the reference that the plan no longer has. */
  readonly gone: readonly string[];
}

export type ExitCode = 0 | 1 | 2;

/** 0 nothing moved, 1 something moved beyond its tolerance, 2 a curve could not be computed. */
export function exitCodeOf({ outcomes }: Night): ExitCode {
  const has = (state: CurveOutcome['state']): boolean => outcomes.some((outcome) => outcome.state === state);
  return has('failed') ? 2 : has('moved') ? 1 : 0;
}

export function summaryJson(night: Night): string {
  const summary = {
    run: night.run,
    startedAt: night.startedAt.toISOString(),
    service: night.service,
    reference: night.reference ?? null,
    exitCode: exitCodeOf(night),
    curves: night.outcomes.map((outcome) => ({
      name: outcome.curve.name,
      state: outcome.state,
      tolerance: outcome.curve.tolerance,
      words: outcomeInWords(outcome),
      ...('files' in outcome
        ? { files: outcome.files }
        : { problem: { detail: outcome.detail, errors: outcome.faults } }),
      ...('compared' in outcome ? comparedOut(outcome.compared) : {}),
    })),
    gone: night.gone,
  };
  return `${JSON.stringify(summary, undefined, 2)}\n`;
}

function comparedOut(compared: NightComparison) {
  const { comparison, changes, planChanged, differences, movedEdges } = compared;
  const { verdict, largest } = comparison;
  return { verdict, largest, movedEdges, causes: causesInWords(compared), inputs: changes, planChanged, differences };
}

export function summaryMarkdown(night: Night): string {
  const rows = night.outcomes.map(({ curve, state, ...rest }) => {
    const name = markdownText(curve.name);
    const shown = 'files' in rest ? `[${name}](${rest.files.markdown})` : name;
    return `| ${shown} | ${state} | ${markdownText(outcomeInWords({ curve, state, ...rest } as CurveOutcome))} |`;
  });
  const causes = night.outcomes.flatMap((outcome) => {
    const details = detailsOf(outcome);
    return details.length === 0
      ? []
      : [`## ${markdownText(outcome.curve.name)}`, details.map((words) => `- ${markdownText(words)}`).join('\n')];
  });
  const pictures = night.outcomes.flatMap((outcome) =>
    'files' in outcome ? [`![${markdownText(outcome.curve.name)}](${outcome.files.svg})`] : [],
  );
  return [
    `# Night ${night.run}`,
    `**${markdownText(conclusionOf(night))}** Computed by ${markdownText(night.service)}; ${referenceInWords(night)}.`,
    ['| curve | state | |', '| --- | --- | --- |', ...rows].join('\n'),
    ...causes,
    ...goneInWords(night).map(markdownText),
    ...pictures,
  ]
    .join('\n\n')
    .concat('\n');
}

/** For people: what was found, and where it is. */
export function summaryLines(night: Night): string[] {
  return [
    `Night ${night.run}; ${referenceInWords(night)}.`,
    ...night.outcomes.flatMap((outcome) => [
      `  ${outcome.curve.name}: ${outcomeInWords(outcome)}`,
      ...detailsOf(outcome).map((words) => `    ${words}`),
    ]),
    ...goneInWords(night),
    conclusionOf(night),
  ];
}

function referenceInWords({ reference }: Night): string {
  return reference === undefined
    ? 'no reference yet; --accept makes tonight the reference'
    : `compared with the reference ${reference}`;
}

function goneInWords({ gone }: Night): string[] {
  return gone.length === 0 ? [] : [`In the reference and no longer in the plan: ${gone.join(', ')}.`];
}

export function outcomeInWords(outcome: CurveOutcome): string {
  if (outcome.state === 'failed') return `failed: ${outcome.detail}`;
  if (outcome.state === 'new') return 'no reference yet';
  const tolerance = `${Number((100 * outcome.curve.tolerance).toPrecision(4))} %`;
  const words = verdictInWords(outcome.compared);
  return outcome.state === 'moved'
    ? `moved beyond ${tolerance}: ${words}`
    : `nothing moved beyond ${tolerance}: ${words}`;
}

/** What did it, or what is wrong, a line each. */
function detailsOf(outcome: CurveOutcome): string[] {
  if (outcome.state === 'failed') return outcome.faults.map(faultInWords);
  if (outcome.state === 'new') return [];
  if (outcome.state === 'same' && outcome.compared.changes.length === 0) return [];
  return causesInWords(outcome.compared);
}

export function faultInWords({ pointer, detail }: Fault): string {
  return `${pointer === undefined || pointer === '' ? '(the whole)' : pointer}: ${detail}`;
}

function conclusionOf(night: Night): string {
  const count = (state: CurveOutcome['state']): number => night.outcomes.filter((o) => o.state === state).length;
  const of = `of ${night.outcomes.length} curves`;
  const moved = count('moved') > 0 ? [`Something moved: ${count('moved')} ${of}.`] : [];
  if (count('failed') > 0) return [`${count('failed')} ${of} could not be computed.`, ...moved].join(' ');
  if (count('new') === night.outcomes.length) return 'Nothing to compare with yet.';
  return moved[0] ?? 'Nothing moved.';
}
