/** The detector behind the crystal: readout, backgrounds, and when its exposure is taken. */
import { z } from 'zod';
import { ABOVE_ZERO, AT_LEAST_ZERO, KINDS, quantity } from './quantity.ts';

export interface ReadoutIn {
  readonly noiseElectrons: number;
  readonly efficiency: number | readonly number[];
  readonly responseMatrix: boolean;
}

const share = z.number().min(0).max(1);

export const Readout = z
  .strictObject({
    noise: z
      .number()
      .min(0)
      .max(100)
      .default(0)
      .meta({ description: 'σ, rms electrons; charge is read as the nearest integer.' }),
    efficiency: z
      .union([share, z.array(share).min(2).max(101)], {
        error: () => 'must be a number from 0 to 1, or a list of them, one for each measured bin from 0',
      })
      .default(1)
      .meta({
        description: 'Share of events kept, after the noise: one number, or one for each measured bin 0…maxElectrons.',
      }),
    responseMatrix: z.boolean().default(false).meta({ description: 'Adds P(n|k) of the noise to the answer.' }),
  })
  .meta({ id: 'Readout', description: 'Noise and efficiency of the readout. Defaults: none, and 1.' })
  .transform(
    (input): ReadoutIn => ({
      noiseElectrons: input.noise,
      efficiency: input.efficiency,
      responseMatrix: input.responseMatrix,
    }),
  );

export const NO_READOUT: ReadoutIn = { noiseElectrons: 0, efficiency: 1, responseMatrix: false };

const named = {
  name: z.string().min(1).max(100),
  relativeUncertainty: z
    .number()
    .min(0)
    .max(10)
    .default(0)
    .meta({ description: 'r, one for all bins of this background; 0 is exactly known.' }),
};

const PerBin = z
  .strictObject({
    ...named,
    kind: z.literal('perBin'),
    rates: z
      .array(
        z.strictObject({
          electrons: z.int().min(0).max(100),
          rate: quantity('BackgroundRate', KINDS.rate, AT_LEAST_ZERO, 'Rate in this measured bin.'),
        }),
      )
      .min(1)
      .max(101),
  })
  .meta({ id: 'PerBinBackground', description: 'Rates per measured bin, taken as measured; bins not named are 0.' })
  .transform(({ rates, ...rest }) => ({
    ...rest,
    rates: rates.map(({ electrons, rate }) => ({ electrons, ratePerKgYear: rate })),
  }));

const Flat = z
  .strictObject({
    ...named,
    kind: z.literal('flat'),
    rate: quantity('FlatRate', KINDS.spectralRate, AT_LEAST_ZERO, 'Rate per deposited energy.'),
  })
  .meta({
    id: 'FlatBackground',
    description: 'Flat in deposited energy; goes through ionization, noise and efficiency.',
  })
  .transform(({ rate, ...rest }) => ({ ...rest, ratePerKgYearKev: rate }));

const DarkCurrent = z
  .strictObject({
    ...named,
    kind: z.literal('darkCurrent'),
    current: quantity('Current', KINDS.current, AT_LEAST_ZERO, 'Electrons per pixel and time.'),
    pixelMass: quantity('PixelMass', KINDS.detectorMass, ABOVE_ZERO, 'Mass of a pixel.'),
    readoutInterval: quantity('ReadoutInterval', KINDS.duration, ABOVE_ZERO, 'Time between two readings of a pixel.'),
  })
  .meta({
    id: 'DarkCurrentBackground',
    description: 'Electrons that appear by themselves and pile up between readings; empty pixels too.',
  })
  .transform(({ current, pixelMass, readoutInterval, ...rest }) => ({
    ...rest,
    electronsPerPixelPerDay: current,
    pixelMassKg: pixelMass,
    readoutIntervalDays: readoutInterval,
  }));

const BackgroundKind = z
  .discriminatedUnion('kind', [PerBin, Flat, DarkCurrent] as never, {
    error: () => 'must be "perBin", "flat" or "darkCurrent"',
  })
  .meta({ id: 'Background' });
export type BackgroundIn = z.output<typeof PerBin> | z.output<typeof Flat> | z.output<typeof DarkCurrent>;

export const Backgrounds = z
  .array(BackgroundKind as unknown as z.ZodType<BackgroundIn>)
  .max(50)
  .default([]);

const NO_INSTANT = 'must be a date such as "2027-03-01", or with a time and its zone, "2027-03-01T12:00:00Z"';
const told = { error: () => NO_INSTANT };

export const instant = z
  .union(
    [
      z.iso.date(told),
      z.iso.datetime({ offset: true, ...told }),
      z.iso.datetime({ offset: true, precision: -1, ...told }),
    ],
    told,
  )
  .meta({ id: 'Date', description: 'ISO 8601; a date without time is 00:00 UTC.' });

export interface PayloadStage {
  /** ms since 1970 UTC; undefined where no date was given. */
  readonly startMs: number | undefined;
  readonly massKg: number;
  readonly livetimeFraction: number;
}

const stage = {
  mass: quantity('PayloadMass', KINDS.detectorMass, ABOVE_ZERO, 'Mass in operation.'),
  livetimeFraction: z
    .number()
    .gt(0)
    .max(1)
    .default(1)
    .meta({ description: 'Share of the time that is live; it sets dates, never the exposure.' }),
};

const milliseconds = (date: string): number => Date.parse(date);

export const Payload = z
  .union(
    [
      z.strictObject({ ...stage, start: instant.optional() }),
      z.strictObject({
        stages: z
          .array(z.strictObject({ ...stage, start: instant }))
          .min(1)
          .max(100),
      }),
    ],
    { error: () => 'must be {"mass": …} or {"stages": […]}' },
  )
  .meta({
    id: 'Payload',
    description: 'What is in operation, from when: one mass, or stages, each replacing the one before.',
  })
  .transform((input, context): PayloadStage[] => {
    const given = 'stages' in input ? input.stages : [input];
    const stages = given.map(({ mass, livetimeFraction, start }) => ({
      startMs: start === undefined ? undefined : milliseconds(start),
      massKg: mass,
      livetimeFraction,
    }));
    stages.forEach(({ startMs }, i) => {
      if (i > 0 && !(startMs! > stages[i - 1].startMs!)) {
        context.addIssue({
          code: 'custom',
          path: ['stages', i, 'start'],
          message: 'must be after the start of the stage before',
        });
      }
    });
    return stages;
  });
