/** Request bodies by name, so that a worker thread can validate one that is too large for the event loop. */
import { CrystalTableIn } from './crystal.ts';
import { MeanInverseSpeedIn } from './mean-inverse-speed.ts';
import { Scenario } from './scenario.ts';

export const BODIES = { scenario: Scenario, crystal: CrystalTableIn, meanInverseSpeed: MeanInverseSpeedIn };
export type BodyName = keyof typeof BODIES;
