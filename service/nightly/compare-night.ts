/** Tonight's curve against the accepted one: whether it moved, by how much, and which input did it. */
import { compareReach, type RatioAt, type ReachComparison } from '../../physics/reach/comparison.ts';
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';
import type { PatchOperation } from '../reports/comparison-markdown.ts';
import { changedInputs, type InputChange, isPlanChanged, type NightCurve, requestPatch } from './changed-inputs.ts';
import { bandEdgesOf, curveOf } from './reach-answer.ts';

export interface NightComparison {
  readonly moved: boolean;
  readonly comparison: ReachComparison;
  /** Edges of the band that moved; of curves with several tables. */
  readonly movedEdges: readonly string[];
  /** Inputs that differ, also where nothing moved. */
  readonly changes: readonly InputChange[];
  /** Whether the plan asks for something else than it did. */
  readonly planChanged: boolean;
  readonly differences: readonly PatchOperation[];
}

export function compareNights(before: NightCurve, after: NightCurve, tolerance: number): NightComparison {
  const comparison = compareReach(curveOf(before.answer), curveOf(after.answer), tolerance);
  const movedEdges = edgesThatMoved(before, after, tolerance);
  return {
    moved: comparison.verdict !== 'same' || movedEdges.length > 0,
    comparison,
    movedEdges,
    changes: changedInputs(before, after),
    planChanged: isPlanChanged(before, after),
    differences: requestPatch(before.answer, after.answer),
  };
}

/** The curve of the first table says nothing of the others: the edges of the band are held against their own. */
function edgesThatMoved(before: NightCurve, after: NightCurve, tolerance: number): string[] {
  const [one, other] = [bandEdgesOf(before.answer), bandEdgesOf(after.answer)];
  if (!one || !other) return [];
  const moved = (from: CurvePoint[], to: CurvePoint[]): boolean => compareReach(from, to, tolerance).verdict !== 'same';
  return (['lowest', 'highest'] as const).filter((side) => moved(one[side], other[side]));
}

const WORDS: Readonly<Record<ReachComparison['verdict'], string>> = {
  better: 'reaches further',
  same: 'reaches as far',
  worse: 'reaches less far',
  mixed: 'moved both ways',
};

/** One line: the verdict and the largest changes. */
export function verdictInWords({ comparison, movedEdges }: NightComparison): string {
  const { verdict, largest, knownPoints } = comparison;
  if (knownPoints === 0) return 'no mass at which both curves are known';
  const at = (name: string, found: RatioAt | null): string[] =>
    found ? [`largest ${name} ${percent(found.ratio)} at ${number(found.massMev)} MeV`] : [];
  const oneSided = (name: string, points: ReachComparison['onlyBaseline']): string[] => {
    const lost = points.filter(({ reason }) => reason === 'unreachable').length;
    return lost > 0 ? [`${lost} ${lost === 1 ? 'mass' : 'masses'} ${name}`] : [];
  };
  return [
    WORDS[verdict],
    ...at('gain', largest.gain),
    ...at('loss', largest.loss),
    ...oneSided('no longer reached', comparison.onlyBaseline),
    ...oneSided('newly reached', comparison.onlyCandidate),
    ...movedEdges.map((side) => `the ${side} of its tables moved`),
  ].join(', ');
}

/** Which input did it, one line each. */
export function causesInWords({ moved, changes, planChanged }: NightComparison): string[] {
  if (changes.length === 0) return moved ? ['nothing in the inputs: the numbers alone moved'] : ['no input changed'];
  const whose = planChanged
    ? 'the plan asks for something else than it did'
    : 'the plan is the same; the service changed under it';
  return [...changes.map(({ input, words }) => `${input}: ${words}`), `(${whose})`];
}

/** Cross section against that of the reference. */
function percent(ratio: number): string {
  if (ratio > 10 || ratio < 0.1) return `σ̄ₑ × ${number(ratio)}`;
  return `σ̄ₑ ${ratio < 1 ? '−' : '+'}${number(100 * Math.abs(ratio - 1))} %`;
}

function number(value: number): string {
  return String(Number(value.toPrecision(4)));
}
