/**
 * An ionization model that also says how far up in energy it feeds a bin. A crystal's table ends somewhere; a flat background does
 * not, so its energy integral needs this end.
 */
import type { IonizationModel } from './ionization-model.ts';
import { stepEdgeEv, stepIonization } from './step.ts';

export interface IonizationWithReach extends IonizationModel {
  /** Energy, eV, above which an event frees `electrons` or fewer (but at least one) with a probability below 1e-12. */
  reachEv(electrons: number): number;
}

/** The step model with its reach, the lower edge of the next bin. Same domain and errors as stepIonization. */
export function stepWithReach(bandGapEv: number, energyPerPairEv: number): IonizationWithReach {
  return {
    ...stepIonization(bandGapEv, energyPerPairEv),
    reachEv: (electrons) => stepEdgeEv(bandGapEv, energyPerPairEv, electrons + 1),
  };
}
