import { defineRoute, negotiate } from '../route.ts';
import { MeanInverseSpeedAnswer } from '../schemas/mean-inverse-speed.ts';

export const meanInverseSpeed = defineRoute({
  method: 'post',
  path: '/v1/halo/mean-inverse-speed',
  operationId: 'computeMeanInverseSpeed',
  tag: 'halo',
  summary: 'The mean inverse speed η(v_min) of a halo',
  body: 'meanInverseSpeed',
  examples: {
    default: {
      summary: 'The default halo at four speeds',
      value: { speeds: { unit: 'km/s', values: [0, 294, 600, 780] } },
    },
    smooth: {
      summary: 'Another halo, smooth at its edge',
      value: { halo: { circularSpeed: '220 km/s', cutoff: 'smooth' }, speeds: { unit: 'km/s', values: [100, 500] } },
    },
  },
  responses: { 200: { description: 'η at each speed, in their order.', schema: MeanInverseSpeedAnswer } },
  problems: ['malformed-body', 'not-acceptable', 'too-large', 'media-type', 'invalid-input', 'busy'],
  async handle({ c, body, dependencies: { compute }, signal }) {
    negotiate(c, ['application/json']);
    const began = performance.now();
    const answer = await compute.run('meanInverseSpeed', body, { signal });
    c.header('Server-Timing', `compute;dur=${(performance.now() - began).toFixed(2)}`);
    return c.json(answer);
  },
});
