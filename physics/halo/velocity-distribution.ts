/**
 * What the rest of the calculation needs to know of a velocity distribution of dark matter in the laboratory: its mean
 * inverse speed η(v_min) = ∫_{v > v_min} f(v)/v d³v and where that function bends.
 */
export interface VelocityDistribution {
  /** No particle is faster than this in the laboratory, km/s: η is exactly 0 from here on. */
  readonly largestSpeedKmPerS: number;
  /** Speeds, km/s, ascending, between 0 and the largest speed, where η or one of its first derivatives jumps. */
  readonly kinksKmPerS: readonly number[];
  /**
   * Those speeds, ascending, at which a table of η must begin anew: where η itself jumps (a cold stream), and the two
   * ends of a stretch over which it falls within a small share of the largest speed. Absent: none. At a jump η is the
   * value above it.
   */
  readonly sectionEndsKmPerS?: readonly number[];
  /** η(v_min) in s/km for v_min ≥ 0 in km/s. */
  meanInverseSpeed(vMinKmPerS: number): number;
}
