import { provenanceOf } from '../provenance.ts';
import { resolveScenario } from '../resolve-scenario.ts';
import { defineRoute, negotiate } from '../route.ts';
import { TradeOffsAnswer } from '../schemas/trade-offs.ts';

export const tradeOffs = defineRoute({
  method: 'post',
  path: '/v1/trade-offs',
  operationId: 'computeTradeOffs',
  tag: 'rates',
  summary: 'The exposure against threshold and readout interval, and the cheapest choice',
  description:
    'One rate, many exposures: a window that starts higher sees less signal and less dark current; a shorter readout interval piles up ' +
    'less (n-electron pile-up grows as interval^(n − 1)).',
  body: 'tradeOffs',
  examples: {
    thresholdAndInterval: {
      summary: 'Two thresholds and three intervals for 90 % exclusion',
      value: {
        scenario: {
          darkMatter: { mass: '10 MeV', referenceCrossSection: '1e-39 cm^2', mediator: 'heavy' },
          crystal: { id: 'silicon' },
          backgrounds: [
            {
              name: 'dark current',
              kind: 'darkCurrent',
              current: '1e-4 1/day',
              pixelMass: '0.35 ug',
              readoutInterval: '1 day',
            },
          ],
          goal: { kind: 'exclusion', confidence: 0.9 },
        },
        windowFrom: [2, 3],
        readoutInterval: { unit: 'h', values: [2, 8, 24] },
      },
    },
  },
  responses: { 200: { description: 'Every choice, and the cheapest.', schema: TradeOffsAnswer } },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies, signal }) {
    negotiate(c, ['application/json']);
    const { crystals, compute, version } = dependencies;
    const { scenario, table } = await resolveScenario(body.scenario, dependencies, '/scenario');
    const { windowFrom, readoutIntervalsDays } = body;
    const id = scenario.crystal.id;
    const began = performance.now();
    const job = { scenario, table, goal: scenario.goal!, windowFrom, readoutIntervalsDays };
    const answer = await crystals.using(id, () => compute.run('tradeOffs', job, { signal }));
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    return c.json({ ...answer, provenance: provenanceOf({ scenario, windowFrom, readoutIntervalsDays }, id, version) });
  },
});
