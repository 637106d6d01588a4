/** How deposited energy becomes electrons. */
import { z } from 'zod';
import { type ChargeTable, InlineChargeTable } from './charge-table.ts';
import { ABOVE_ZERO, AT_LEAST_ZERO, KINDS, quantity } from './quantity.ts';

export interface IonizationIn {
  readonly bandGapEv: number | undefined;
  readonly energyPerPairEv: number | undefined;
  readonly maxElectrons: number;
  readonly model: 'step' | 'fano' | 'table';
  readonly fanoFactor: number | undefined;
  readonly table: ChargeTable | { readonly id: string } | undefined;
}

/** Faults between fields. Runs on whatever could be read. */
function checkIonization(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const { bandGap, energyPerPair, model, fanoFactor, table } = input as Record<string, unknown>;
  const issue = (field: string, message: string): void => context.addIssue({ code: 'custom', path: [field], message });
  // a faulty quantity is still what came in, perhaps a bare number: its own fault is enough
  const read = (field: string): boolean => !context.issues.some(({ path }) => path?.[0] === field);
  const both = read('bandGap') && read('energyPerPair');
  if (both && typeof bandGap === 'number' && typeof energyPerPair === 'number' && energyPerPair < bandGap) {
    issue('energyPerPair', `must be at least the band gap, ${bandGap} eV`);
  }
  if (model === 'fano' && fanoFactor === undefined) issue('fanoFactor', 'is needed by the model "fano"');
  if (model !== 'fano' && fanoFactor !== undefined) issue('fanoFactor', 'belongs to the model "fano"');
  if (model === 'table' && table === undefined) issue('table', 'is needed by the model "table"');
  if (model !== 'table' && table !== undefined) issue('table', 'belongs to the model "table"');
}

export const Ionization = z
  .strictObject({
    bandGap: quantity('IonizationBandGap', KINDS.energy, AT_LEAST_ZERO, 'Band gap; default: the crystal’s.').optional(),
    energyPerPair: quantity(
      'IonizationEnergyPerPair',
      KINDS.energy,
      ABOVE_ZERO,
      'Mean energy per electron; default: the crystal’s.',
    ).optional(),
    maxElectrons: z.int().min(1).max(100).default(15).meta({ description: 'Last electron bin returned.' }),
    model: z
      .enum(['step', 'fano', 'table'])
      .default('step')
      .meta({
        description:
          'step: E frees exactly n = 1 + floor((E − bandGap)/energyPerPair) electrons. fano: N̄ = ½ + (E − bandGap)/energyPerPair on ' +
          'average, normally spread with the Fano factor (variance F N̄ + 1/12), at most floor(E/bandGap). table: P(n|E) as given.',
      }),
    fanoFactor: z
      .number()
      .min(0)
      .max(10)
      .optional()
      .meta({ description: 'F; about 0.12 in silicon and germanium. For the model fano.' }),
    table: z
      .union([InlineChargeTable, z.strictObject({ id: z.string().max(100) })], {
        error: () => 'must be {"id": "…"} of a stored charge table, or one inline',
      })
      .optional()
      .meta({ description: 'For the model table: P(n|E), stored or inline.' }),
  })
  .superRefine(checkIonization, { when: () => true })
  .meta({ id: 'Ionization', description: 'How deposited energy becomes electrons; nothing below the band gap.' })
  .transform(
    (i): IonizationIn => ({
      bandGapEv: i.bandGap,
      energyPerPairEv: i.energyPerPair,
      maxElectrons: i.maxElectrons,
      model: i.model,
      fanoFactor: i.fanoFactor,
      table: i.table,
    }),
  );

/** What stands where a request says nothing of ionization. */
export const DEFAULT_IONIZATION: IonizationIn = Ionization.parse({});
