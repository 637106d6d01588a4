/** A scenario with everything looked up: the table by its id, gap and pair energy from the request or from the table. */
import type { ChargeTable } from '../schemas/charge-table.ts';
import type { BackgroundIn, PayloadStage, ReadoutIn } from '../schemas/detector.ts';
import type { GoalIn } from '../schemas/goal.ts';
import type { HaloIn } from '../schemas/halo.ts';
import type { IonizationIn } from '../schemas/ionization.ts';
import type { DarkMatterIn } from '../schemas/scenario.ts';
import type { Screening } from '../schemas/screening.ts';

export interface ResolvedIonization extends IonizationIn {
  readonly bandGapEv: number;
  readonly energyPerPairEv: number;
  readonly table: ChargeTable | undefined;
}

export interface ResolvedCrystal {
  readonly id: string;
  /** Whether in-medium screening is in the numbers that the rates are made of. */
  readonly screened: boolean;
  /** The screened twin of an unscreened table: used, offered to the caller, or not to be had (screened already, or no cell volume). */
  readonly twin: 'used' | 'offered' | 'none';
  /** Fixes the strength above the table's last energy, for the twin. */
  readonly electronsPerCell: number | undefined;
}

export interface ResolvedScenario {
  readonly darkMatter: DarkMatterIn;
  readonly halo: HaloIn;
  readonly crystal: ResolvedCrystal;
  readonly screening: Screening;
  readonly ionization: ResolvedIonization;
  readonly readout: ReadoutIn | undefined;
  readonly backgrounds: readonly BackgroundIn[];
  readonly goal: GoalIn | undefined;
  readonly payload: readonly PayloadStage[] | undefined;
  readonly spectrum: boolean;
}
