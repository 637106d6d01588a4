/** Request bodies by name, so that a worker thread can validate one that is too large for the event loop. */
import { ChargeTableIn } from './charge-table.ts';
import { Comparison } from './comparisons.ts';
import { CrystalTableIn } from './crystal.ts';
import { CrystalComparison } from './crystal-comparisons.ts';
import { MeanInverseSpeedIn } from './mean-inverse-speed.ts';
import { Reach } from './reach.ts';
import { CrystalRegrid } from './crystal-regrids.ts';
import { Scenario } from './scenario.ts';
import { TradeOffs } from './trade-offs.ts';

export const BODIES = {
  scenario: Scenario,
  crystal: CrystalTableIn,
  crystalComparison: CrystalComparison,
  crystalRegrid: CrystalRegrid,
  chargeTable: ChargeTableIn,
  reach: Reach,
  comparison: Comparison,
  tradeOffs: TradeOffs,
  meanInverseSpeed: MeanInverseSpeedIn,
};
export type BodyName = keyof typeof BODIES;
