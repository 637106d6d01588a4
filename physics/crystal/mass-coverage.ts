/**
 * For which dark-matter masses a table covers what the halo allows. From the lightest that can free an electron up to the first
 * at which a noticeable part of the rate sits at the table's last momentum or energy, and more, unseen, beyond it.
 */
import { DomainError } from '../errors.ts';
import type { VelocityDistribution } from '../halo/velocity-distribution.ts';
import { stepIonization } from '../ionization/step.ts';
import { crystalRate, type RangeCut } from '../rate/crystal-rate.ts';
import type { CrystalTable } from './crystal-table.ts';

export interface MassCoverage {
  readonly mediator: 'heavy' | 'light';
  /** The lightest mass that frees an electron, eV. */
  readonly fromEv: number;
  /** The heaviest mass that is covered, eV; undefined if all are, up to `HEAVIEST_EV`. */
  readonly toEv: number | undefined;
  /** Which end of the table comes first, for a mass just above. */
  readonly limit: 'momentum' | 'energy' | undefined;
  /** Rate next to the first momentum, where the halo allows smaller ones: largest share of the total over the masses tried. */
  readonly lowerMomentumShare: number;
}

/** Rates of all heavier particles have the same shape to 1 %: v_min = E/q + q/2m is E/q. */
export const HEAVIEST_EV = 1e10;
/** Part of the rate in the last 5 % of an axis above which the table is taken to miss "a few per cent" beyond: a rate falls by e in
 * a tenth to a fifth of the axis. */
const LARGEST_EDGE_SHARE = 0.01;
/** Where there is no gap any mass frees electrons; coverage is looked for from here on. */
const LIGHTEST_EV = 1e3;
/** The heaviest mass is found to this ratio. */
const MASS_STEP = 1.1;

/**
 * Coverage for one mediator. Found by bisection in ln m, to 10 %, on the share of the rate in the last 5 % of either axis (at most
 * 1 %) or the kinematic limit inside the table; the share is taken to grow with the mass.
 *
 * @throws DomainError where the rate itself is refused (gap 0 with momenta from 0)
 */
export function massCoverage(
  table: CrystalTable,
  mediator: 'heavy' | 'light',
  bandGapEv: number,
  halo: VelocityDistribution,
): MassCoverage {
  const top = table.energyEv[table.energyEv.length - 1];
  if (!(bandGapEv < top)) throw new DomainError('bandGap', bandGapEv, `below the table's last energy, ${top} eV`);
  const ionization = stepIonization(bandGapEv, Math.max(bandGapEv, top - bandGapEv));
  const rateAt = (massEv: number) =>
    crystalRate({
      massEv,
      crossSectionCm2: 1e-37,
      mediator: { kind: mediator },
      splittingEv: 0,
      localDensityGevPerCm3: 0.3,
      halo,
      table,
      ionization,
      energyPerPairEv: Math.max(bandGapEv, top - bandGapEv),
      maxElectrons: 1,
    });

  let lowerMomentumShare = 0;
  const upperCut = (massEv: number): RangeCut | undefined => {
    const { rangeCuts } = rateAt(massEv);
    for (const { axis, end, edgeShare } of rangeCuts)
      if (axis === 'momentum' && end === 'lower') lowerMomentumShare = Math.max(lowerMomentumShare, edgeShare);
    return rangeCuts.filter(({ end }) => end === 'upper').sort((a, b) => b.edgeShare - a.edgeShare)[0];
  };
  const isShort = (cut: RangeCut | undefined): cut is RangeCut =>
    cut !== undefined && cut.edgeShare > LARGEST_EDGE_SHARE;

  const fromEv = rateAt(HEAVIEST_EV).smallestMassEv;
  let cut = upperCut(HEAVIEST_EV);
  if (!isShort(cut)) return { mediator, fromEv, toEv: undefined, limit: undefined, lowerMomentumShare };
  let [covered, short] = [Math.max(fromEv, LIGHTEST_EV), HEAVIEST_EV];
  while (short > covered * MASS_STEP) {
    const middle = Math.sqrt(covered * short);
    const here = upperCut(middle);
    if (isShort(here)) [short, cut] = [middle, here];
    else covered = middle;
  }
  return { mediator, fromEv, toEv: covered, limit: cut.axis, lowerMomentumShare };
}
