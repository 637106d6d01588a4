/** Every route of the contract, in the order in which the document shows them. */
import type { RouteDefinition } from '../route.ts';
import { deleteChargeTable, getChargeTable, listChargeTables, postChargeTable } from './charge-tables.ts';
import { comparisons } from './comparisons.ts';
import { crystalComparisons } from './crystal-comparisons.ts';
import { crystalRegrids } from './crystal-regrids.ts';
import { deleteCrystal, getCrystal, getCrystalValues, listCrystals, postCrystal } from './crystals.ts';
import { healthz, readyz } from './health.ts';
import { meanInverseSpeed } from './mean-inverse-speed.ts';
import { modulation } from './modulation.ts';
import { rates } from './rates.ts';
import { reach } from './reach.ts';
import { tradeOffs } from './trade-offs.ts';

export const ROUTES: readonly RouteDefinition[] = [
  rates,
  modulation,
  tradeOffs,
  reach,
  comparisons,
  postCrystal,
  listCrystals,
  getCrystal,
  getCrystalValues,
  deleteCrystal,
  crystalComparisons,
  crystalRegrids,
  postChargeTable,
  listChargeTables,
  getChargeTable,
  deleteChargeTable,
  meanInverseSpeed,
  healthz,
  readyz,
];
