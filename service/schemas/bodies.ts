/** Request bodies by name, so that a worker thread can validate one that is too large for the event loop. */
import { ChargeTableIn } from './charge-table.ts';
import { CrystalTableIn } from './crystal.ts';
import { MeanInverseSpeedIn } from './mean-inverse-speed.ts';
import { Scenario } from './scenario.ts';
import { TradeOffs } from './trade-offs.ts';

export const BODIES = {
  scenario: Scenario,
  crystal: CrystalTableIn,
  chargeTable: ChargeTableIn,
  tradeOffs: TradeOffs,
  meanInverseSpeed: MeanInverseSpeedIn,
};
export type BodyName = keyof typeof BODIES;
