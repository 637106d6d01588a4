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
  /** Widest energy segment, eV, over which P(n|E) may be replaced by its value at the middle. Infinity where the breaks suffice. */
  readonly maxSegmentEv: number;
  /** What that rule leaves of error in a bin's rate, relative; 0 where it is exact. */
  readonly segmentError: number;
  /** Energies, eV, ascending, strictly between the limits, at which a segment must end. */
  breaksEv(fromEv: number, toEv: number): number[];
  /** Writes P(n|E) into out[n − 1] for n = 1…out.length; energies below the gap write zeros. */
  probabilities(energyEv: number, out: Float64Array): void;
  /** Energy, eV, above which an event frees `electrons` or fewer (but at least one) with a probability below 1e-12. */
  reachEv(electrons: number): number;
  /** Share of events at this energy whose charge the model does not place in any bin: 1 − Σ P(n|E) over all n. */
  lostFraction(energyEv: number): number;
}
