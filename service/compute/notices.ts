/** What a reader of the numbers should know, one sentence or two for each. */
import type { CrystalRate, RangeCut } from '../../physics/rate/crystal-rate.ts';
import { PLANNING_NOTICE } from '../planning-estimate.ts';
import type { ResolvedScenario } from './resolved-scenario.ts';
import { screeningNotices } from './screening-notices.ts';

export interface NoticeOut {
  code: string;
  detail: string;
}

const significant = (value: number, digits = 4): string => String(Number(value.toPrecision(digits)));

export function rateNotices(scenario: ResolvedScenario, rate: CrystalRate): NoticeOut[] {
  const notices: NoticeOut[] = [PLANNING_NOTICE];
  notices.push(...screeningNotices(scenario.crystal));
  const { massMev, massSplittingEv } = scenario.darkMatter;
  const beyond = firstUnreachable(scenario, rate);
  if (beyond) {
    const splitting = massSplittingEv === 0 ? '' : ` at a mass splitting of ${massSplittingEv} eV`;
    notices.push({
      code: 'unreachable-bins',
      detail:
        `A particle of ${significant(massMev)} MeV gives the crystal at most ${significant(Math.max(0, rate.largestEnergyEv))} eV${splitting}: ` +
        `bins from ${beyond} electrons on are exactly 0. The smallest mass that can reach the lowest energy which frees an electron is ` +
        `${significant(rate.smallestMassEv / 1e6, 6)} MeV.`,
    });
  }
  if ((scenario.readout?.noiseElectrons ?? 0) > 0 && !scenario.backgrounds.some(({ kind }) => kind === 'darkCurrent')) {
    notices.push({
      code: 'noise-without-dark-current',
      detail:
        'Noise makes empty pixels look charged, and their number comes from a background of kind "darkCurrent" (also at zero current): ' +
        'without one they are not counted.',
    });
  }
  for (const cut of rate.rangeCuts) notices.push({ code: `${cut.axis}-range-cut`, detail: rangeCutSentence(cut) });
  return notices;
}

/** The first bin shown that the kinematics leave empty; a tabulated model says so only where they leave everything empty. */
function firstUnreachable(scenario: ResolvedScenario, rate: CrystalRate): number | undefined {
  const { model, bandGapEv, maxElectrons } = scenario.ionization;
  const { largestEnergyEv } = rate;
  if (largestEnergyEv <= bandGapEv) return 1;
  if (model === 'table') return undefined;
  const electrons =
    model === 'step'
      ? rate.bins.find(({ fromEv }) => fromEv >= largestEnergyEv)?.electrons
      : Math.floor(largestEnergyEv / bandGapEv) + 1;
  return electrons !== undefined && electrons <= maxElectrons ? electrons : undefined;
}

function rangeCutSentence({ axis, end, tableEv, kinematicEv, edgeShare }: RangeCut): string {
  const [unit, scale] = axis === 'momentum' ? ['keV', 1e-3] : ['eV', 1];
  const number = (ev: number): string => `${significant(ev * scale)} ${unit}`;
  const share = edgeShare === 0 ? 'none of the rate' : `${significant(100 * edgeShare, 2)} % of the rate`;
  return (
    `The table ${end === 'upper' ? 'ends at' : 'begins at'} ${number(tableEv)} in ${axis}, the kinematics allow ` +
    `${end === 'upper' ? 'up to' : 'down to'} ${number(kinematicEv)}. The 5 % of the axis next to that end hold ${share}; what lies beyond is missing.`
  );
}
