/** The answer of POST /v1/rates. */
import { z } from 'zod';
import { HaloOut } from './halo-answer.ts';
import { estimateOut, quantitiesOut, quantityOut } from './quantity.ts';
import { UncertaintyOut } from './uncertainty.ts';

const RATE = estimateOut('1/(kg yr)');

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

const Check = z
  .strictObject({
    experiments: z.int(),
    seed: z.int(),
    quantity: z.enum(['fraction', 'mean-upper-limit', 'median-significance']).meta({
      description:
        'fraction: of experiments with the events asked for; mean-upper-limit: events, without signal; median-significance: σ, with ' +
        'signal for a discovery, without for an exclusion.',
    }),
    achieved: z.number(),
    standardError: z.number().meta({ description: 'Of achieved, from the number of experiments.' }),
    expected: z.number().meta({ description: 'What the formula says.' }),
    coverage: z
      .number()
      .optional()
      .meta({ description: 'Share of experiments with signal whose upper limit is not below it.' }),
  })
  .meta({ id: 'Check', description: 'Simulated experiments at the needed exposure.' });

const Calendar = z
  .strictObject({
    duration: quantityOut('day').nullable().meta({ description: 'From the start of the payload.' }),
    reached: z
      .string()
      .nullable()
      .meta({ description: 'UTC day; null without a start date, or where the goal is not reached.' }),
  })
  .meta({ id: 'Calendar', description: 'When the payload reaches the needed exposure.' });

export const Exposure = z
  .strictObject({
    needed: estimateOut('kg yr').nullable().meta({
      description:
        'The smallest exposure from which the goal holds, live mass × time; null where none does, and a notice says why.',
    }),
    signalRate: RATE.meta({ description: 'Signal measured in the window.' }),
    backgroundRate: quantityOut('1/(kg yr)').meta({ description: 'All backgrounds in the window.' }),
    expectedSignal: z.number().nullable().meta({ description: 'Events in the window at the needed exposure.' }),
    expectedBackground: z.number().nullable(),
    binding: z
      .enum(['events', 'upper-limit', 'significance', 'minimum-events'])
      .nullable()
      .meta({ description: 'Which condition sets the exposure.' }),
    largestSignificance: z
      .number()
      .optional()
      .meta({ description: 'σ that no exposure passes, where uncertain backgrounds are the reason.' }),
    requiredSignificance: z.number().optional(),
    check: Check.optional(),
    calendar: Calendar.optional(),
  })
  .meta({ id: 'Exposure' });

const Measured = z
  .strictObject({
    bins: z.array(z.strictObject({ electrons: z.int(), signal: RATE, background: quantityOut('1/(kg yr)') })).meta({
      description: 'Measured electrons 0…maxElectrons; bin 0 is shown, never counted. background: all of them.',
    }),
    backgrounds: z.array(z.strictObject({ name: z.string(), rates: quantitiesOut('1/(kg yr)') })).meta({
      description: 'Each background in measured bins 0…maxElectrons.',
    }),
    responseMatrix: z.array(z.array(z.number())).optional().meta({
      description:
        'P(n|k) of the noise: a row for each true k from 0; columns n = 0…maxElectrons and, last, all above. Rows sum to 1.',
    }),
  })
  .meta({ id: 'Measured', description: 'What the detector measures, after noise and efficiency.' });

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

const ResponseOut = z
  .strictObject({
    speeds: z.strictObject({ unit: z.literal('km/s'), edges: z.array(z.number()) }),
    kernels: z.array(z.strictObject({ electrons: z.int(), values: quantitiesOut('1/(kg yr)') })),
  })
  .meta({
    id: 'Response',
    description:
      'Halo-independent: R_n = ∫ K_n(v) η(v) dv for any halo of the scenario’s local density. Per bin of true electrons the mean of K_n in ' +
      'each cell of speeds, one value fewer than edges: R_n ≈ Σ K_n ∫_cell η dv. Nothing below the first edge; empty where nothing is reached.',
  });

export const RatesAnswer = z
  .strictObject({
    bins: z.array(Bin),
    total: RATE.meta({ description: 'Sum of the bins.' }),
    overflow: RATE.meta({ description: 'What lies above the last bin.' }),
    lostCharge: RATE.optional().meta({ description: 'Events whose charge a table of P(n|E) places in no bin.' }),
    measured: Measured.optional().meta({ description: 'With a readout or backgrounds; bins stay the true electrons.' }),
    exposure: Exposure.optional(),
    halo: HaloOut.optional().meta({ description: 'With a date or a model other than the standard one.' }),
    spectrum: SpectrumOut.optional(),
    response: ResponseOut.optional(),
    uncertainty: UncertaintyOut.optional(),
    notices: z.array(Notice),
    provenance: Provenance,
  })
  .meta({
    id: 'RatesAnswer',
    description: 'Rates per ionization bin, and the exposure for the goal. Planning estimates.',
  });
export type RatesAnswer = z.output<typeof RatesAnswer>;
