/**
 * What an ionization model must say so that rates per energy become rates per electron bin: R_n = ∫ dE P(n|E) dR/dE.
 *
 * The rate core integrates dR/dE exactly over energy segments and multiplies each by P(n|E) at the segment's middle. A model
 * therefore names the energies at which a weight jumps, and the widest segment over which its weights are straight lines to
 * the accuracy it promises.
 */
export interface IonizationModel {
  /** Lowest energy that frees an electron, eV. */
  readonly bandGapEv: number;
  /** Widest energy segment, eV, over which P(n|E) may be replaced by its value at the middle. Infinity for the step model. */
  readonly maxSegmentEv: number;
  /** Energies, eV, ascending, strictly between the limits, at which any P(n|E), n = 1…lastElectron+1, is discontinuous. */
  breaksEv(fromEv: number, toEv: number): number[];
  /** Writes P(n|E) into out[n − 1] for n = 1…out.length; energies below the gap write zeros. */
  probabilities(energyEv: number, out: Float64Array): void;
}
