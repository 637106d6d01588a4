/** Every route of the contract, in the order in which the document shows them. */
import type { RouteDefinition } from '../route.ts';
import { deleteChargeTable, getChargeTable, listChargeTables, postChargeTable } from './charge-tables.ts';
import { deleteCrystal, getCrystal, getCrystalValues, listCrystals, postCrystal } from './crystals.ts';
import { healthz, readyz } from './health.ts';
import { meanInverseSpeed } from './mean-inverse-speed.ts';
import { rates } from './rates.ts';
import { tradeOffs } from './trade-offs.ts';

export const ROUTES: readonly RouteDefinition[] = [
  rates,
  tradeOffs,
  postCrystal,
  listCrystals,
  getCrystal,
  getCrystalValues,
  deleteCrystal,
  postChargeTable,
  listChargeTables,
  getChargeTable,
  deleteChargeTable,
  meanInverseSpeed,
  healthz,
  readyz,
];
