import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DomainError } from '../../../physics/errors.ts';
import { compareReach, type Verdict } from '../../../physics/reach/comparison.ts';
import { type CurvePoint, logSpacedMasses } from '../../../physics/reach/mass-grid.ts';

/** [mass MeV, cross section cm²] pairs as a curve. */
function curve(...points: [number, number | null][]): CurvePoint[] {
  return points.map(([massMev, crossSectionCm2]) => ({ massMev, crossSectionCm2 }));
}

/** σ = 1e-38 cm² (m/MeV)^power on a grid. */
function powerLaw(power: number, fromMev: number, toMev: number, count: number): CurvePoint[] {
  return logSpacedMasses({ fromMev, toMev, count }).map((massMev) => ({
    massMev,
    crossSectionCm2: 1e-38 * massMev ** power,
  }));
}

const OPPOSITE: Record<Verdict, Verdict> = { better: 'worse', worse: 'better', same: 'same', mixed: 'mixed' };

describe('compareReach', () => {
  it('finds equal curves the same, with every ratio 1 and nothing largest', () => {
    const one = curve([0.5, null], [1, 3e-37], [10, 1e-38], [100, 5e-38]);
    expect(compareReach(one, [...one].reverse(), 0)).toEqual({
      verdict: 'same',
      points: [
        { massMev: 0.5, baselineCm2: null, candidateCm2: null, ratio: null },
        { massMev: 1, baselineCm2: 3e-37, candidateCm2: 3e-37, ratio: 1 },
        { massMev: 10, baselineCm2: 1e-38, candidateCm2: 1e-38, ratio: 1 },
        { massMev: 100, baselineCm2: 5e-38, candidateCm2: 5e-38, ratio: 1 },
      ],
      largest: { gain: null, loss: null },
      onlyBaseline: [],
      onlyCandidate: [],
      commonRangeMev: { from: 0.5, to: 100 },
      interpolatedPoints: 0,
      knownPoints: 4,
    });
  });

  it('interpolates power laws exactly on different grids', () => {
    const found = compareReach(powerLaw(1, 1, 1000, 7), powerLaw(1.5, 2, 4000, 12), 0.05);
    expect(found.commonRangeMev).toEqual({ from: 2, to: 1000 });
    // 6 masses of the first and 9 of the second curve lie in the common range; none is on both grids.
    expect(found.points).toHaveLength(15);
    expect(found.interpolatedPoints).toBe(15);
    for (const { massMev, ratio } of found.points) expect(Math.abs(ratio! / massMev ** 0.5 - 1)).toBeLessThan(1e-11);
    expect(found.verdict).toBe('worse');
    expect(found.largest).toEqual({ gain: null, loss: { massMev: 1000, ratio: found.points[14].ratio } });
  });

  it('says which side it interpolated', () => {
    const found = compareReach(curve([1, 1e-38], [100, 1e-36]), curve([1, 1e-38], [10, 2e-37], [100, 1e-36]), 0.05);
    expect(found.points.map(({ massMev, interpolated }) => [massMev, interpolated])).toEqual([
      [1, undefined],
      [10, 'baseline'],
      [100, undefined],
    ]);
    expect(found.points[1].ratio).toBeCloseTo(2, 10);
  });

  it('takes a mass that differs in the last digits for the same', () => {
    const found = compareReach(curve([0.3, 1e-38]), curve([0.1 + 0.2, 1e-38]), 0);
    expect(found).toMatchObject({ verdict: 'same', interpolatedPoints: 0, points: [{ massMev: 0.3, ratio: 1 }] });
  });

  it('compares nothing where the ranges do not meet, and does not call that the same', () => {
    const found = compareReach(curve([1, 1e-38], [2, 1e-38]), curve([3, 1e-38], [4, null]), 0.05);
    expect(found).toEqual({
      verdict: 'mixed',
      points: [],
      largest: { gain: null, loss: null },
      onlyBaseline: [
        { massMev: 1, crossSectionCm2: 1e-38, reason: 'outside' },
        { massMev: 2, crossSectionCm2: 1e-38, reason: 'outside' },
      ],
      onlyCandidate: [{ massMev: 3, crossSectionCm2: 1e-38, reason: 'outside' }],
      commonRangeMev: null,
      interpolatedPoints: 0,
      knownPoints: 0,
    });
  });

  it('does not call curves the same that nowhere have a mass where both are known', () => {
    const found = compareReach(curve([2, 1e-38], [3, null]), curve([1, null], [2.5, 1e-38]), 0.05);
    // At 2 the candidate and at 2.5 the baseline ends between its masses; 3 is outside the candidate's.
    expect(found).toMatchObject({ verdict: 'mixed', knownPoints: 0, points: [{ massMev: 2 }, { massMev: 2.5 }] });
  });

  it('compares where they touch in one mass', () => {
    const found = compareReach(curve([1, 1e-38], [2, 1e-38]), curve([2, 1e-38], [4, 1e-38]), 0.05);
    expect(found).toMatchObject({ verdict: 'same', commonRangeMev: { from: 2, to: 2 }, points: [{ ratio: 1 }] });
  });

  // Baseline: reached from 2 MeV on, 1e-38 cm² at 2, 4 and 8 MeV.
  it.each<{ why: string; candidate: CurvePoint[]; verdict: Verdict }>([
    { why: 'a mass gained', candidate: curve([1, 1e-37], [2, 1e-38], [4, 1e-38], [8, 1e-38]), verdict: 'better' },
    { why: 'a mass lost', candidate: curve([1, null], [2, null], [4, 1e-38], [8, 1e-38]), verdict: 'worse' },
    {
      why: 'a mass lost, a ratio gained',
      candidate: curve([1, null], [2, null], [4, 5e-39], [8, 1e-38]),
      verdict: 'mixed',
    },
    {
      why: 'a mass gained, a ratio lost',
      candidate: curve([1, 1e-37], [2, 1e-38], [4, 2e-38], [8, 1e-38]),
      verdict: 'mixed',
    },
    {
      why: 'a ratio within the tolerance',
      candidate: curve([1, null], [2, 1.01e-38], [4, 0.99e-38], [8, 1e-38]),
      verdict: 'same',
    },
    { why: 'nothing reached any more', candidate: curve([1, null], [8, null]), verdict: 'worse' },
    {
      why: 'an edge between the masses',
      candidate: curve([1, null], [1.5, null], [2, 1e-38], [8, 1e-38]),
      verdict: 'same',
    },
    {
      why: 'a mass in the gap at the edge',
      candidate: curve([1, null], [1.5, 1e-37], [2, 1e-38], [8, 1e-38]),
      verdict: 'same',
    },
    {
      why: 'a longer curve',
      candidate: curve([0.5, null], [1, null], [2, 1e-38], [4, 1e-38], [90, 1e-36]),
      verdict: 'same',
    },
  ])('weighs reachability: $why is $verdict', ({ candidate, verdict }) => {
    const baseline = curve([1, null], [2, 1e-38], [4, 1e-38], [8, 1e-38]);
    const longer = candidate.some(({ massMev }) => massMev === 90);
    const found = compareReach(longer ? baseline.slice(0, 3) : baseline, candidate, 0.05);
    expect(found.verdict).toBe(verdict);
  });

  it('never interpolates across a gap, and says what it does not know', () => {
    const gap = curve([1, 1e-38], [2, null], [4, null], [8, 1e-38]);
    const full = curve([1, 1e-38], [1.5, 1e-38], [3, 1e-38], [6, 1e-38], [8, 1e-38]);
    const found = compareReach(gap, full, 0.05);
    expect(found.onlyCandidate).toEqual(
      [
        { massMev: 1.5, crossSectionCm2: 1e-38, reason: 'undecided' },
        { massMev: 2, crossSectionCm2: 1e-38, reason: 'unreachable' },
        { massMev: 3, crossSectionCm2: 1e-38, reason: 'unreachable' },
        { massMev: 4, crossSectionCm2: 1e-38, reason: 'unreachable' },
        { massMev: 6, crossSectionCm2: 1e-38, reason: 'undecided' },
      ].map((point) => ({ ...point, crossSectionCm2: expect.closeTo(1e-38, 50) })),
    );
    expect(found.points.filter(({ ratio }) => ratio !== null).map(({ massMev }) => massMev)).toEqual([1, 8]);
    expect(found.onlyBaseline).toEqual([]);
  });

  // ln(1.05) itself is within, one part in 10⁹ beyond is not; 1/1.05 is as far as 1.05.
  it.each<{ ratio: number; tolerance: number; verdict: Verdict }>([
    { ratio: 1.05, tolerance: 0.05, verdict: 'same' },
    { ratio: 1 / 1.05, tolerance: 0.05, verdict: 'same' },
    { ratio: 1.05 * (1 + 1e-9), tolerance: 0.05, verdict: 'worse' },
    { ratio: 1 / (1.05 * (1 + 1e-9)), tolerance: 0.05, verdict: 'better' },
    { ratio: 0.951, tolerance: 0.05, verdict: 'better' },
    { ratio: 1, tolerance: 0, verdict: 'same' },
    { ratio: 1 + 1e-9, tolerance: 0, verdict: 'worse' },
    { ratio: 3, tolerance: 2, verdict: 'same' },
  ])('calls a ratio of $ratio at tolerance $tolerance $verdict', ({ ratio, tolerance, verdict }) => {
    for (const sigma of [1e-38, 3.3e-41, 7e-33])
      expect(compareReach(curve([5, sigma]), curve([5, sigma * ratio]), tolerance).verdict).toBe(verdict);
  });

  it('names the largest gain and loss with their masses, of equal ones the lightest', () => {
    const baseline = curve([1, 1e-38], [2, 1e-38], [3, 1e-38], [4, 1e-38], [5, 1e-38]);
    const candidate = curve([1, 2e-38], [2, 5e-39], [3, 5e-39], [4, 2e-38], [5, 1e-38]);
    const { largest, verdict } = compareReach(baseline, candidate, 0.05);
    expect(verdict).toBe('mixed');
    expect(largest).toEqual({ gain: { massMev: 2, ratio: 0.5 }, loss: { massMev: 1, ratio: 2 } });
  });

  it('is antisymmetric: swapped, ratios are inverse and the verdict is the opposite', () => {
    const points = fc
      .array(
        fc.record({
          massMev: fc.integer({ min: 1, max: 30 }),
          crossSectionCm2: fc.option(
            fc.integer({ min: 90, max: 112 }).map((n) => n * 1e-40),
            { freq: 4 },
          ),
        }),
        { minLength: 1, maxLength: 12 },
      )
      .map((all) => all.filter(({ massMev }, i) => all.findIndex((p) => p.massMev === massMev) === i));
    const seen = new Set<Verdict>();
    let ratios = 0;
    fc.assert(
      fc.property(points, points, (one, other) => {
        const there = compareReach(one, other, 0.05);
        const back = compareReach(other, one, 0.05);
        seen.add(there.verdict);
        expect(back.verdict).toBe(OPPOSITE[there.verdict]);
        expect(back.onlyBaseline).toEqual(there.onlyCandidate);
        expect(back.onlyCandidate).toEqual(there.onlyBaseline);
        expect(back.points.map((p) => p.massMev)).toEqual(there.points.map((p) => p.massMev));
        there.points.forEach(({ ratio }, i) => {
          if (ratio === null) return expect(back.points[i].ratio).toBeNull();
          ratios++;
          expect(Math.abs(back.points[i].ratio! * ratio - 1)).toBeLessThan(1e-14);
        });
      }),
      { numRuns: 300, seed: 4 },
    );
    expect([...seen].sort()).toEqual(['better', 'mixed', 'same', 'worse']);
    expect(ratios).toBeGreaterThan(300);
  });

  it('refuses what is no curve and no tolerance', () => {
    const good = curve([1, 1e-38]);
    expect(() => compareReach([], good, 0.05)).toThrow(/baseline/);
    expect(() => compareReach(good, curve([1, 1e-38], [0, 1e-38]), 0.05)).toThrow(/candidate\.1\.mass/);
    for (const sigma of [0, -1, Number.NaN, Infinity])
      expect(() => compareReach(curve([1, sigma]), good, 0.05)).toThrow(/baseline\.0\.crossSection/);
    for (const tolerance of [-0.1, Number.NaN, Infinity])
      expect(() => compareReach(good, good, tolerance)).toThrow(DomainError);
  });
});
