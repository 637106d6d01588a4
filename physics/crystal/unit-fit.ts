/**
 * Which unit a table's axes are in, asked of the physics rather than of its author. Two things are known beforehand for any
 * electrons: the f-sum rule (crystal/sum-rule), and that they respond on the Bethe ridge E = q²/2mₑ, so that a table ending at
 * energy T holds less and less of the rule beyond q = √(2 mₑ T). Reading momenta as c times and energies as s times what they were
 * takes q → c q, T → s T, and the share to s²/c⁵ of itself for |f|², to s² of itself for a dielectric response.
 */
import { ELECTRON_MASS_EV, HBAR_C_EV_ANGSTROM, REFERENCE_MOMENTUM_EV } from '../constants.ts';
import { median } from '../numeric/median.ts';
import { type CrystalTable, cellVolumePerEv3 } from './crystal-table.ts';
import { fullResponseEv2, nearOneTo, type SumRule } from './sum-rule.ts';

const HARTREE_EV = REFERENCE_MOMENTUM_EV ** 2 / ELECTRON_MASS_EV;

/** Units in which axes are met, in eV. */
const MOMENTUM_UNITS = {
  eV: 1,
  keV: 1e3,
  'alpha m_e (1/bohr)': REFERENCE_MOMENTUM_EV,
  '1/angstrom': HBAR_C_EV_ANGSTROM,
  '1/nm': HBAR_C_EV_ANGSTROM / 10,
};
const ENERGY_UNITS = { eV: 1, meV: 1e-3, Ry: HARTREE_EV / 2, hartree: HARTREE_EV, keV: 1e3 };

export interface UnitReading {
  readonly axis: 'momentum' | 'energy';
  /** The unit that would fit, where `said` was said. */
  readonly fits: string;
  readonly said: string;
  /** What the axis would have to be multiplied by. */
  readonly factor: number;
  /** Median f-sum share, where it should be near 1, if that were the unit. */
  readonly share: number;
}

/** What is known of a table whose axes are asked for their units. */
export interface UnitEvidence {
  readonly table: CrystalTable;
  readonly rule: SumRule;
  readonly electronsPerCell: number;
  /** Smallest share of the f-sum rule that the table may have. */
  readonly smallestShare: number;
  /** Lowest energy with strength, eV, and the gap where it should be. */
  readonly onsetEv: number;
  readonly bandGapEv: number | undefined;
  /** The unit momenta were given in, where known: 'eV', 'keV', 'alpha m_e (1/bohr)', '1/angstrom' or '1/nm'. */
  readonly momentumUnit: string | undefined;
}

export interface AxisScore {
  /** Rows at which the share should be near 1, and the median of it there (0 without rows). */
  readonly rows: number;
  readonly share: number;
  /** Momentum beyond which less than half of the largest share is left, in units of √(2 mₑ T); undefined if the table ends before. */
  readonly ridge: number | undefined;
}

/** Shares that units alone can be judged by: above them something is wrong, below them strength may lie above the table. */
const LARGEST_SHARE = 1.1;
/** The built-in tables lie between 0.75 and 0.9; the smallest factor between units met is 1.9. */
const RIDGE = { from: 0.5, typical: 0.83, to: 1.6 };
/** Measured: built-in tables cut at 6 to 40 eV lie between 0.25 and 2.5. */
const WIDE_RIDGE = { from: 0.2, to: 2.6 };
/** Where the volume is not known: valence plasmons lie between 15 and 35 eV. */
const TYPICAL_PLASMA_EV = 20;
const FEWEST_ROWS = 2;

/** Largest median of five neighbours: a maximum that a single noisy row does not make. */
function steadyMaximum(values: Float64Array): number {
  let most = 0;
  for (let i = 0; i < values.length; i++) most = Math.max(most, median(values.subarray(Math.max(0, i - 2), i + 3)));
  return most;
}

/** How well the axes fit if momenta are `c` times, and energies `s` times, what the table says. */
export function axisScore(table: CrystalTable, rule: SumRule, electronsPerCell: number, c = 1, s = 1): AxisScore {
  const scale = table.quantity === 'formFactorSquared' ? s ** 2 / c ** 5 : s ** 2;
  const top = table.energyEv[table.energyEv.length - 1] * s;
  const to = nearOneTo(table, electronsPerCell, top);
  const inside = rule.share.filter((_, i) => rule.momentumEv[i] * c <= to);
  const share = median(inside);
  const most = steadyMaximum(rule.share);
  let last = rule.share.length - 1;
  while (last >= 0 && rule.share[last] < most / 2) last--;
  const isSeen = last >= 0 && last < rule.share.length - 1;
  const ridge = isSeen ? (rule.momentumEv[last] * c) / Math.sqrt(2 * ELECTRON_MASS_EV * top) : undefined;
  return { rows: inside.length, share: share * scale, ridge };
}

/** ω_p of the electrons as if they were free, eV; a typical one where the cell's volume is not known. */
export function plasmaEnergyEv(table: CrystalTable, electronsPerCell: number): number {
  const volume = cellVolumePerEv3(table);
  return volume > 0 ? Math.sqrt((2 / Math.PI) * fullResponseEv2(electronsPerCell, volume)) : TYPICAL_PLASMA_EV;
}

/** What a table must satisfy for its axes to be right. */
export interface Demands {
  /** Smallest share of the f-sum rule. */
  readonly share: number;
  /** Range of the ridge, in units of √(2 mₑ T). */
  readonly ridge: { readonly from: number; readonly to: number };
}

/**
 * What is demanded of a table that ends at energy T, ω_p the plasma energy of its electrons: all where the table holds the plasmon
 * and more; no share in particular where it ends below, nor a sharp ridge up to 1.5 ω_p, because collective strength leaves the
 * table at smaller momenta than single electrons.
 */
export function demandsOf(table: CrystalTable, electronsPerCell: number, smallestShare: number): Demands {
  const plasma = plasmaEnergyEv(table, electronsPerCell);
  const top = table.energyEv[table.energyEv.length - 1];
  return { share: top > plasma ? smallestShare : 0, ridge: top > 1.5 * plasma ? RIDGE : WIDE_RIDGE };
}

/** Whether strength leaves the table at the momentum at which electrons do, as far as the table shows. */
export function isOnRidge({ ridge }: AxisScore, demands: Demands): boolean {
  return ridge === undefined || (ridge > demands.ridge.from && ridge < demands.ridge.to);
}

/** Whether the axes can be right: enough rows to tell, neither too little strength nor more than the electrons have, the ridge. */
export function axesFit(score: AxisScore, demands: Demands): boolean {
  const { rows, share } = score;
  return rows >= FEWEST_ROWS && share >= demands.share && share <= LARGEST_SHARE && isOnRidge(score, demands);
}

/** An onset further from the gap than this says no more: e² = 7. */
const MOST_ONSET_COST = 2;

/**
 * The readings of one axis in another unit under which both fit, the likeliest first: by the distances, in logarithms, of the share
 * from 1, of the ridge from where built-in tables have it, and of the onset from the gap. Without `momentumUnit`, momenta are
 * taken to have been given in keV, or to be in keV.
 */
export function fittingUnits(evidence: UnitEvidence): UnitReading[] {
  const { table, rule, electronsPerCell, smallestShare, momentumUnit } = evidence;
  const isKnown = momentumUnit !== undefined && momentumUnit in MOMENTUM_UNITS;
  const momentum = readings('momentum', MOMENTUM_UNITS).filter(({ said, fits }) =>
    isKnown ? said === momentumUnit : said === 'keV' || fits === 'keV',
  );
  const energy = readings('energy', ENERGY_UNITS).filter(({ said }) => said === 'eV');
  return [...momentum, ...energy]
    .flatMap((reading) => {
      const [c, s] = reading.axis === 'momentum' ? [reading.factor, 1] : [1, reading.factor];
      const score = axisScore(table, rule, electronsPerCell, c, s);
      if (!axesFit(score, { share: smallestShare, ridge: RIDGE })) return [];
      return [{ reading: { ...reading, share: score.share }, cost: cost(score, s, evidence) }];
    })
    .sort((a, b) => a.cost - b.cost)
    .map(({ reading }) => reading);
}

function cost({ share, ridge }: AxisScore, s: number, { onsetEv, bandGapEv }: UnitEvidence): number {
  const distance = (x: number): number => Math.abs(Math.log(x));
  const isKnown = bandGapEv !== undefined && bandGapEv > 0 && onsetEv > 0 && onsetEv < Infinity;
  const onset = isKnown ? Math.min(MOST_ONSET_COST, distance((onsetEv * s) / bandGapEv)) : 0;
  return distance(share) + (ridge === undefined ? 0 : distance(ridge / RIDGE.typical)) + onset;
}

function readings(axis: UnitReading['axis'], units: Readonly<Record<string, number>>): Omit<UnitReading, 'share'>[] {
  const names = Object.keys(units);
  return names.flatMap((said) =>
    names.filter((fits) => fits !== said).map((fits) => ({ axis, said, fits, factor: units[fits] / units[said] })),
  );
}
