/**
 * When an exposure is reached. Exposure is live mass × time: with stages i of mass mᵢ and live fraction fᵢ from tᵢ on, each in the
 * place of the one before, X(t) = Σ mᵢ fᵢ (time in stage i). The live fraction only sets dates.
 */
export interface PayloadStage {
  /** Days from any common origin. */
  readonly startDay: number;
  /** Mass in operation, kg, > 0. */
  readonly massKg: number;
  /** Share of the time that is live, 0 < f ≤ 1. */
  readonly livetimeFraction: number;
}

const DAYS_PER_YEAR = 365.25;

/**
 * Days from the origin until the exposure (kg yr, ≥ 0) is reached. Stages in ascending order, the last one without end.
 *
 * @example dayReached([{ startDay: 0, massKg: 0.1, livetimeFraction: 0.8 }], 0.04) // 182.625
 */
export function dayReached(stages: readonly PayloadStage[], exposureKgYr: number): number {
  let missing = exposureKgYr * DAYS_PER_YEAR; // kg days
  for (let i = 0; i < stages.length; i++) {
    const { startDay, massKg, livetimeFraction } = stages[i];
    const perDay = massKg * livetimeFraction;
    const day = startDay + missing / perDay;
    const end = stages[i + 1]?.startDay ?? Infinity;
    if (day <= end) return day;
    missing -= (end - startDay) * perDay;
  }
  return Infinity; // no stage at all
}
