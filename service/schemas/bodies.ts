/** Request bodies by name, so that a worker thread can validate one that is too large for the event loop. */
import { ChargeTableIn } from './charge-table.ts';
import { Comparison } from './comparisons.ts';
import { CrystalTableIn } from './crystal.ts';
import { CrystalComparison } from './crystal-comparisons.ts';
import { CrystalRegrid } from './crystal-regrids.ts';
import { MeanInverseSpeedIn } from './mean-inverse-speed.ts';
import { ModulationRequest } from './modulation.ts';
import { RatesRequest } from './rates-request.ts';
import { Reach } from './reach.ts';
import { TradeOffs } from './trade-offs.ts';

export const BODIES = {
  rates: RatesRequest,
  crystal: CrystalTableIn,
  crystalComparison: CrystalComparison,
  crystalRegrid: CrystalRegrid,
  chargeTable: ChargeTableIn,
  reach: Reach,
  comparison: Comparison,
  tradeOffs: TradeOffs,
  modulation: ModulationRequest,
  meanInverseSpeed: MeanInverseSpeedIn,
};
export type BodyName = keyof typeof BODIES;
