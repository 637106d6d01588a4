/** The answer of POST /v1/rates. */
import { z } from 'zod';
import { quantityOut } from './quantity.ts';

const RATE = quantityOut('1/(kg yr)', { relativeError: true });

export const Notice = z
  .strictObject({
    code: z.string().meta({ description: 'Stable name of the kind of notice.' }),
    detail: z.string(),
  })
  .meta({ id: 'Notice', description: 'Something a reader of the numbers should know.' });

export const Provenance = z
  .strictObject({
    service: z.strictObject({ name: z.string(), version: z.string() }),
    constants: z.strictObject({ codata: z.int() }).meta({ description: 'Year of the CODATA release.' }),
    crystal: z.strictObject({ id: z.string() }).optional().meta({ description: 'SHA-256 of the table.' }),
    request: z.strictObject({ sha256: z.string() }).meta({
      description:
        'SHA-256 of the canonical request (RFC 8785): defaults filled in, units converted, tables replaced by their ids.',
    }),
  })
  .meta({ id: 'Provenance', description: 'What the answer depends on.' });

const Bin = z
  .strictObject({
    electrons: z.int(),
    energy: z.strictObject({ unit: z.literal('eV'), from: z.number(), to: z.number() }),
    rate: RATE,
  })
  .meta({
    id: 'Bin',
    description: 'Rate of events that free exactly this many electrons; half-open in energy, [from, to).',
  });

const Exposure = z
  .strictObject({
    needed: z
      .strictObject({ value: z.number(), unit: z.literal('kg yr'), relativeError: z.number().min(0) })
      .nullable()
      .meta({
        description: 'The smallest exposure that reaches the goal; null where none does, and a notice says why.',
      }),
    signalRate: RATE.meta({ description: 'Rate in the window.' }),
    expectedSignal: z
      .number()
      .nullable()
      .meta({ description: 'Events expected in the window at the needed exposure.' }),
    expectedBackground: z.number().nullable(),
  })
  .meta({ id: 'Exposure' });

const SpectrumOut = z
  .strictObject({
    energy: z.strictObject({ unit: z.literal('eV'), edges: z.array(z.number()) }),
    rate: z.strictObject({
      unit: z.literal('1/(kg yr eV)'),
      values: z.array(z.number()),
      relativeErrors: z.array(z.number()),
    }),
  })
  .meta({
    id: 'Spectrum',
    description:
      'Mean dR/dE between neighbouring numbers of the table’s energy axis, from the gap up; one value fewer than edges.',
  });

export const RatesAnswer = z
  .strictObject({
    bins: z.array(Bin),
    total: RATE.meta({ description: 'Sum of the bins.' }),
    overflow: RATE.meta({ description: 'What lies above the last bin.' }),
    exposure: Exposure.optional(),
    spectrum: SpectrumOut.optional(),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({
    id: 'RatesAnswer',
    description: 'Rates per ionization bin, and the exposure for the goal. Planning estimates.',
  });
export type RatesAnswer = z.output<typeof RatesAnswer>;
