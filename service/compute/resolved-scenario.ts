/** A scenario with everything looked up: the table by its id, gap and pair energy from the request or from the table. */
import type { ChargeTable } from '../schemas/charge-table.ts';
import type { BackgroundIn, PayloadStage, ReadoutIn } from '../schemas/detector.ts';
import type { GoalIn } from '../schemas/goal.ts';
import type { HaloIn } from '../schemas/halo.ts';
import type { IonizationIn } from '../schemas/ionization.ts';
import type { DarkMatterIn } from '../schemas/scenario.ts';

export interface ResolvedIonization extends IonizationIn {
  readonly bandGapEv: number;
  readonly energyPerPairEv: number;
  readonly table: ChargeTable | undefined;
}

export interface ResolvedScenario {
  readonly darkMatter: DarkMatterIn;
  readonly halo: HaloIn;
  readonly crystal: { readonly id: string; readonly screened: boolean };
  readonly ionization: ResolvedIonization;
  readonly readout: ReadoutIn | undefined;
  readonly backgrounds: readonly BackgroundIn[];
  readonly goal: GoalIn | undefined;
  readonly payload: readonly PayloadStage[] | undefined;
  readonly spectrum: boolean;
}
