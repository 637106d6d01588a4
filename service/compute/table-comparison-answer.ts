/** The answer of POST /v1/crystals/{id}/comparisons but for its provenance: runs in a worker thread. */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { type Block, compareTables, type TableComparison } from '../../physics/crystal/table-comparison.ts';
import { PLANNING_NOTICE } from '../planning-estimate.ts';
import type { CrystalComparisonAnswer } from '../schemas/crystal-comparisons.ts';
import { rateOut, sumOf } from './estimates.ts';
import { haloOf } from './halos.ts';
import { keptTable } from './kept-tables.ts';
import type { NoticeOut } from './notices.ts';
import type { ResolvedCrystal, ResolvedScenario } from './resolved-scenario.ts';
import { responseScenarioOf } from './response-scenario.ts';
import { screeningNotices } from './screening-notices.ts';
import { unrepresentable } from './unrepresentable.ts';

export interface TableComparisonJob {
  /** With the baseline's crystal; gap and pair energy hold for both. */
  readonly scenario: ResolvedScenario;
  readonly baseline: CrystalTable;
  readonly otherCrystal: ResolvedCrystal;
  readonly candidate: CrystalTable;
  /** The candidate's own gap, where it gives one. */
  readonly otherBandGapEv: number | undefined;
}

export function tableComparisonAnswer(job: TableComparisonJob): Omit<CrystalComparisonAnswer, 'provenance'> {
  const { scenario, baseline, otherCrystal, candidate } = job;
  const { halo, ionization, crystal } = scenario;
  const { table, ...rest } = responseScenarioOf({ scenario, table: baseline }, ionization.maxElectrons);
  const comparison = compareTables({ ...rest, halo: haloOf(halo) }, table, keptTable(otherCrystal, candidate));
  refuseUnrepresentable(comparison);
  const total = {
    baseline: sumOf(comparison.bins.map((bin) => bin.baseline)),
    candidate: sumOf(comparison.bins.map((bin) => bin.candidate)),
  };
  return {
    baseline: { id: crystal.id, screened: crystal.screened },
    candidate: { id: otherCrystal.id, screened: otherCrystal.screened },
    bins: comparison.bins.map(({ electrons, fromEv, toEv, ...bin }) => ({
      electrons,
      energy: { unit: 'eV', from: fromEv, to: toEv },
      baseline: rateOut(bin.baseline),
      candidate: rateOut(bin.candidate),
      ratio: ratioOut(bin.ratio),
    })),
    total: {
      baseline: rateOut(total.baseline),
      candidate: rateOut(total.candidate),
      ratio: ratioOut(total.candidate.value / total.baseline.value),
    },
    aboveGap: {
      baseline: plainRate(comparison.baseline),
      candidate: plainRate(comparison.candidate),
      ratio: ratioOut(comparison.ratio),
    },
    blocks: comparison.blocks.map(blockOut),
    notices: noticesOf(job),
  };
}

function plainRate(value: number): { value: number; unit: '1/(kg yr)' } {
  return { value, unit: '1/(kg yr)' };
}

/** A baseline of 0, or so near it that the ratio is beyond all numbers, has none. */
function ratioOut(ratio: number | undefined): number | null {
  return ratio !== undefined && Number.isFinite(ratio) ? ratio : null;
}

function blockOut({ momentumEv, energyEv, baseline, candidate, difference }: Block) {
  return {
    momentum: { unit: 'keV' as const, from: momentumEv.from / 1e3, to: momentumEv.to / 1e3 },
    energy: { unit: 'eV' as const, ...energyEv },
    baseline: plainRate(baseline),
    candidate: plainRate(candidate),
    difference: plainRate(candidate - baseline),
    share: difference,
  };
}

function refuseUnrepresentable({ bins, baseline, candidate, blocks }: TableComparison): void {
  const numbers = [
    baseline,
    candidate,
    ...bins.flatMap((bin) => [bin.toEv, ...Object.values(bin.baseline), ...Object.values(bin.candidate)]),
    ...blocks.flatMap((block) => [block.baseline, block.candidate, block.difference]),
  ];
  if (!numbers.every(Number.isFinite)) throw unrepresentable();
}

function noticesOf({ scenario, otherCrystal, otherBandGapEv }: TableComparisonJob): NoticeOut[] {
  const { crystal, ionization } = scenario;
  const notices = [
    PLANNING_NOTICE,
    ...screeningNotices(crystal, 'The table of the URL'),
    ...screeningNotices(otherCrystal, 'The other table'),
  ];
  if (crystal.screened !== otherCrystal.screened) {
    const detail =
      'One table has in-medium screening in its numbers and the other has not: that is part of the difference.';
    notices.push({ code: 'different-screening', detail });
  }
  if (otherBandGapEv !== undefined && otherBandGapEv !== ionization.bandGapEv) {
    const detail = `The other table gives a band gap of ${otherBandGapEv} eV; both were compared with ${ionization.bandGapEv} eV.`;
    notices.push({ code: 'different-gaps', detail });
  }
  return notices;
}
