import { z } from 'zod';
import { Problem } from '../problem.ts';
import { defineRoute } from '../route.ts';

const State = z.strictObject({ status: z.literal('ok') }).meta({ id: 'State' });

export const healthz = defineRoute({
  method: 'get',
  path: '/healthz',
  operationId: 'isAlive',
  tag: 'service',
  summary: 'Whether the process is alive',
  responses: { 200: { description: 'It is.', schema: State } },
  problems: [],
  handle: ({ c }) => c.json({ status: 'ok' }, 200, { 'Cache-Control': 'no-store' }),
});

export const readyz = defineRoute({
  method: 'get',
  path: '/readyz',
  operationId: 'isReady',
  tag: 'service',
  summary: 'Whether the service can take work',
  responses: { 200: { description: 'It can.', schema: State } },
  problems: ['busy'],
  handle: ({ c, dependencies }) => {
    if (!dependencies.isReady())
      throw new Problem('busy', 'The service is starting or shutting down.', [], { 'Retry-After': '1' });
    return c.json({ status: 'ok' }, 200, { 'Cache-Control': 'no-store' });
  },
});
