/** POST /v1/rates: a scenario, and what else is asked of it. */
import { z } from 'zod';
import { checkScenario, type ScenarioIn, scenarioOf, scenarioShape } from './scenario.ts';
import { Uncertainty, type UncertaintyIn, whyNotDrawn } from './uncertainty.ts';

export interface RatesIn {
  readonly scenario: ScenarioIn;
  /** Whether the halo-independent response is asked for. */
  readonly response: boolean;
  readonly uncertainty: UncertaintyIn | undefined;
}

/** Parameters that have no part in the scenario. Runs only where everything could be read. */
function checkUncertainty({ scenario, uncertainty }: RatesIn, context: z.RefinementCtx): void {
  if (!uncertainty) return;
  const { halo, ionization } = scenario;
  uncertainty.parameters.forEach((name, i) => {
    const why = whyNotDrawn(name, halo, ionization);
    const path = 'covariance' in uncertainty.spread ? ['covariance', 'parameters', i] : ['parameters', name];
    if (why !== undefined) context.addIssue({ code: 'custom', path: ['uncertainty', ...path], message: why });
  });
}

export const RatesRequest = z
  .strictObject({
    ...scenarioShape,
    response: z.boolean().default(false).meta({ description: 'Adds the rates’ response K(v) to any halo.' }),
    uncertainty: Uncertainty.optional(),
  })
  .superRefine(checkScenario, { when: () => true })
  .meta({ id: 'RatesRequest', description: 'A scenario. Without a goal the answer has rates only.' })
  .transform(({ response, uncertainty, ...rest }, context): RatesIn => {
    const request = { scenario: scenarioOf(rest), response, uncertainty };
    checkUncertainty(request, context);
    return request;
  });
