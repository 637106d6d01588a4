/** Requests made of invented numbers, small enough to be computed in no time. */

/** A plain JSON value that tests take apart and put together again. */
export type Json = Record<string, unknown>;

export const inventedTable = (over: Json = {}): Json => ({
  name: 'Invented numbers',
  cellMass: '52.32 GeV',
  bandGap: '1.12 eV',
  energyPerPair: '3.8 eV',
  momentum: { unit: 'keV', edges: [1, 2, 4] },
  energy: { unit: 'eV', edges: [0, 4, 8, 12] },
  formFactorSquared: [
    [0.1, 0.2, 0.1],
    [0, 0.3, 0.2],
  ],
  ...over,
});

export const inventedDarkMatter = (over: Json = {}): Json => ({
  mass: '10 MeV',
  referenceCrossSection: '1e-37 cm^2',
  mediator: 'heavy',
  ...over,
});

export const inventedScenario = (over: Json = {}): Json => ({
  darkMatter: inventedDarkMatter(),
  crystal: inventedTable(),
  ...over,
});

/** A copy of `value` with `changed` at the RFC 6901 pointer; `undefined` takes the field away. */
export function changedAt(value: Json, pointer: string, changed: unknown): Json {
  const copy = structuredClone(value);
  const keys = pointer.split('/').slice(1);
  const last = keys.pop()!;
  const holder = keys.reduce<Json>((at, key) => {
    at[key] ??= {};
    return at[key] as Json;
  }, copy);
  if (changed === undefined) delete holder[last];
  else Object.defineProperty(holder, last, { value: changed, enumerable: true, configurable: true, writable: true });
  return copy;
}

/** A table of rows × columns invented numbers: large enough to be work. */
export function largeTable(rows: number, columns: number, name = 'Many invented numbers'): Json {
  return {
    name,
    cellMass: '52.32 GeV',
    bandGap: '1.12 eV',
    energyPerPair: '3.8 eV',
    momentum: { unit: 'keV', edges: { start: 0.05, step: 30 / rows, count: rows + 1 } },
    energy: { unit: 'eV', edges: { start: 0, step: 50 / columns, count: columns + 1 } },
    formFactorSquared: Array.from({ length: rows }, (_, i) =>
      Array.from({ length: columns }, (_, j) => Math.exp(-(((i * 3) / rows) ** 2)) * (1 + ((7 * i + 13 * j) % 11))),
    ),
  };
}
