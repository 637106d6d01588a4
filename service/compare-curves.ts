/** Two reach curves, computed or given, against each other. */
import { createPatch } from 'rfc6902';
import { compareReach, type OneSidedPoint, type RatioAt, type ReachComparison } from '../physics/reach/comparison.ts';
import type { CurvePoint } from '../physics/reach/mass-grid.ts';
import type { FigureCurve } from './figure/figure-input.ts';
import { PLANNING_NOTICE } from './planning-estimate.ts';
import { provenanceOf } from './provenance.ts';
import { reachCurve } from './reach.ts';
import type { Dependencies } from './route.ts';
import type { ComparisonAnswer, ComparisonIn, SideIn } from './schemas/comparisons.ts';

interface Side {
  readonly points: readonly CurvePoint[];
  readonly request: Readonly<Record<string, unknown>> | undefined;
  readonly lightestMassMev: number | undefined;
}

export interface CurvesCompared {
  readonly comparison: ReachComparison;
  readonly answer: ComparisonAnswer;
  /** Both, for a figure. */
  readonly curves: FigureCurve[];
}

export async function compareCurves(
  input: ComparisonIn,
  dependencies: Dependencies,
  signal: AbortSignal,
): Promise<CurvesCompared> {
  const { tolerance } = input;
  const baseline = await sideOf(input.baseline, dependencies, signal, '/baseline');
  const candidate = await sideOf(input.candidate, dependencies, signal, '/candidate');
  const comparison = compareReach(baseline.points, candidate.points, tolerance);
  const differences = baseline.request && candidate.request ? createPatch(baseline.request, candidate.request) : [];
  const canonical = {
    baseline: baseline.request ?? baseline.points,
    candidate: candidate.request ?? candidate.points,
    tolerance,
  };
  const figured = (name: string, side: Side): FigureCurve => ({
    name,
    points: side.points,
    lightestMassMev: side.lightestMassMev,
  });
  return {
    comparison,
    curves: [figured('baseline', baseline), figured('candidate', candidate)],
    answer: {
      verdict: comparison.verdict,
      points: comparison.points.map(({ massMev, ratio, interpolated }) => ({
        mass: { value: massMev, unit: 'MeV' },
        ratio,
        ...(interpolated === undefined ? {} : { interpolated }),
      })),
      largest: { gain: ratioOut(comparison.largest.gain), loss: ratioOut(comparison.largest.loss) },
      onlyBaseline: comparison.onlyBaseline.map(oneSidedOut),
      onlyCandidate: comparison.onlyCandidate.map(oneSidedOut),
      differences,
      notices: [
        PLANNING_NOTICE,
        ...(comparison.interpolatedPoints > 0
          ? [
              {
                code: 'interpolated',
                detail: `At ${comparison.interpolatedPoints} masses one side is interpolated, log–log between its neighbours.`,
              },
            ]
          : []),
        ...(comparison.knownPoints === 0
          ? [{ code: 'nothing-in-common', detail: 'There is no mass at which both curves are known.' }]
          : []),
      ],
      provenance: provenanceOf(canonical, undefined, dependencies.version),
    },
  };
}

async function sideOf(side: SideIn, dependencies: Dependencies, signal: AbortSignal, at: string): Promise<Side> {
  if ('points' in side) {
    const points = side.points.map(({ mass, crossSection }) => ({
      massMev: mass.value,
      crossSectionCm2: crossSection?.value ?? null,
    }));
    return { points, request: side.request, lightestMassMev: side.lightestMass?.value };
  }
  const curve = await reachCurve(side, dependencies, signal, at);
  const points: CurvePoint[] = [];
  for await (const { mass, crossSection } of curve.points)
    points.push({ massMev: mass.value, crossSectionCm2: crossSection?.value ?? null });
  const { request, lightestMass } = curve.summary();
  return { points, request, lightestMassMev: lightestMass?.value };
}

function ratioOut(at: RatioAt | null): ComparisonAnswer['largest']['gain'] {
  return at && { mass: { value: at.massMev, unit: 'MeV' }, ratio: at.ratio };
}

function oneSidedOut({ massMev, crossSectionCm2, reason }: OneSidedPoint): ComparisonAnswer['onlyBaseline'][number] {
  return { mass: { value: massMev, unit: 'MeV' }, crossSection: { value: crossSectionCm2, unit: 'cm^2' }, reason };
}
