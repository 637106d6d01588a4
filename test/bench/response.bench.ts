/**
 * Times halo draws and dates through the response: `npx tsx test/bench/response.bench.ts`. Prints processor times and the ratios that
 * matter, on a table of 900 momenta and 500 energies: 1,000 halo draws, and 365 dates, each against one rate.
 */
import type { CrystalTable } from '../../physics/crystal/crystal-table.ts';
import { seededRandom } from '../../physics/exposure/random.ts';
import { laboratorySpeedKmPerS, PECULIAR_VELOCITY_KM_PER_S } from '../../physics/halo/earth-velocity.ts';
import { standardHalo } from '../../physics/halo/standard-halo.ts';
import { stepIonization } from '../../physics/ionization/step.ts';
import { crystalRate } from '../../physics/rate/crystal-rate.ts';
import { response, responseRates } from '../../physics/rate/response.ts';

const [ROWS, COLUMNS] = [900, 500];
const REPETITIONS = 9;
const values = Float64Array.from({ length: ROWS * COLUMNS }, (_, k) => {
  const energy = (k % COLUMNS) * 0.1;
  return Math.exp(-(((energy - 17) / 8) ** 2)) * (1 + 0.3 * Math.sin(k));
});
/** A table that has not been seen before: panels kept from an earlier run do not help it. */
const newTable = (): CrystalTable => ({
  axes: 'edges',
  quantity: 'formFactorSquared',
  momentumEv: Float64Array.from({ length: ROWS + 1 }, (_, i) => 100 + 20 * i),
  energyEv: Float64Array.from({ length: COLUMNS + 1 }, (_, i) => 0.1 * i),
  values,
  cellMassEv: 52.32e9,
});
const halo = (circularSpeedKmPerS: number, escapeSpeedKmPerS: number, laboratorySpeed: number) =>
  standardHalo({ circularSpeedKmPerS, escapeSpeedKmPerS, laboratorySpeedKmPerS: laboratorySpeed, cutoff: 'sharp' });
const scenario = (table: CrystalTable) => ({
  massEv: 1e7,
  crossSectionCm2: 1e-37,
  mediator: { kind: 'heavy' } as const,
  splittingEv: 0,
  localDensityGevPerCm3: 0.3,
  table,
  ionization: stepIonization(1.12, 3.8),
  energyPerPairEv: 3.8,
  maxElectrons: 12,
});

/** Median processor time of repeated runs, ms, after one that warms up; what `prepare` does is not timed. */
function medianMs<T>(prepare: () => T, run: (prepared: T) => unknown): number {
  run(prepare());
  const times = Array.from({ length: REPETITIONS }, () => {
    const prepared = prepare();
    const from = process.cpuUsage();
    run(prepared);
    const { user, system } = process.cpuUsage(from);
    return (user + system) / 1000;
  });
  return times.sort((a, b) => a - b)[Math.floor(REPETITIONS / 2)];
}

const random = seededRandom(7);
const DRAWS = Array.from({ length: 1000 }, () => [238 + 3 * (random() - 0.5), 544 + 60 * (random() - 0.5)]);
const FASTEST = 900;
const DATES = Array.from({ length: 365 }, (_, day) => Date.UTC(2027, 0, 1 + day));

const known = newTable();
const rate = medianMs(newTable, (table) => crystalRate({ ...scenario(table), halo: halo(238, 544, 250) }));
const again = medianMs(
  () => halo(238, 544, 250 + random()),
  (h) => crystalRate({ ...scenario(known), halo: h }),
);
const one = medianMs(newTable, (table) => response(scenario(table), FASTEST));
const oneAgain = medianMs(
  () => known,
  (table) => response(scenario(table), FASTEST),
);
const kernel = response(scenario(known), FASTEST);
const draws = medianMs(
  () => undefined,
  () => {
    for (const [v0, vEsc] of DRAWS) responseRates(kernel, halo(v0, vEsc, laboratorySpeedKmPerS(v0)));
  },
);
const dates = medianMs(
  () => undefined,
  () => {
    for (const ms of DATES)
      responseRates(kernel, halo(238, 544, laboratorySpeedKmPerS(238, PECULIAR_VELOCITY_KM_PER_S, ms)));
  },
);

const ratio = (ms: number, of: number): string => (ms / of).toFixed(2);
console.log(`one rate: new table ${rate.toFixed(1)} ms, known table and new halo ${again.toFixed(1)} ms`);
console.log(
  `response: new table ${one.toFixed(1)} ms (${ratio(one, rate)} rates), known table ${oneAgain.toFixed(1)} ms (${ratio(oneAgain, again)})`,
);
console.log(
  `1,000 halo draws: ${draws.toFixed(1)} ms; with the response ${ratio(draws + one, rate)} rates on a new table, ${ratio(draws + oneAgain, again)} on a known one`,
);
console.log(
  `365 dates: ${dates.toFixed(1)} ms; with the response ${ratio(dates + one, rate)} rates on a new table, ${ratio(dates + oneAgain, again)} on a known one`,
);
