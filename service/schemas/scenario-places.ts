/** Where in a request body a scenario can stand: at its root, or inside a question about one or two of them. */
const PLACES = [[], ['scenario'], ['baseline', 'scenario'], ['candidate', 'scenario']] as const;

export interface ScenarioPlace {
  readonly path: readonly string[];
  readonly scenario: Record<string, unknown>;
}

const isObject = (value: unknown): value is Record<string, unknown> =>
  typeof value === 'object' && value !== null && !Array.isArray(value);

/** Every object of an unvalidated body that may be a scenario. */
export function scenarioPlaces(body: unknown): ScenarioPlace[] {
  return PLACES.flatMap((path) => {
    let at: unknown = body;
    for (const key of path) at = isObject(at) && Object.hasOwn(at, key) ? at[key] : undefined;
    return isObject(at) ? [{ path, scenario: at }] : [];
  });
}
