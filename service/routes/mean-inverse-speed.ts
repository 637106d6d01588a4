import { defineRoute, negotiate } from '../route.ts';
import { MeanInverseSpeedAnswer } from '../schemas/mean-inverse-speed.ts';

export const meanInverseSpeed = defineRoute({
  method: 'post',
  path: '/v1/halo/mean-inverse-speed',
  operationId: 'computeMeanInverseSpeed',
  tag: 'halo',
  summary: 'The mean inverse speed η(v_min) of a halo',
  description:
    'For the standard model, a sum of Gaussians or a table, at a given speed of the laboratory or on a date; with ' +
    '"speedDistribution": true also the distribution of speeds in the laboratory.',
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
    components: {
      summary: 'A round halo, a radially anisotropic part and a stream, on a date',
      value: {
        halo: {
          date: '2027-06-02',
          model: 'components',
          components: [
            { weight: 0.75, dispersion: '168 km/s' },
            { weight: 0.2, dispersion: { unit: 'km/s', values: [250, 110, 100] } },
            {
              weight: 0.05,
              dispersion: '20 km/s',
              meanVelocity: { unit: 'km/s', values: [-30, -230, -90] },
              escapeSpeed: '560 km/s',
            },
          ],
        },
        speeds: { unit: 'km/s', values: [0, 250, 500, 750] },
        speedDistribution: true,
      },
    },
    tabulated: {
      summary: 'A distribution of speeds in the galaxy as a table',
      value: {
        halo: {
          model: 'tabulated',
          tabulated: {
            kind: 'galactic',
            speeds: { unit: 'km/s', values: [0, 100, 200, 300, 400, 544] },
            values: [0, 0.8, 2, 2.1, 0.9, 0],
          },
        },
        speeds: { unit: 'km/s', values: [0, 300, 600] },
      },
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
