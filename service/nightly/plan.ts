/** The plan of the night: named reach curves and how far each may move. */
import { z } from 'zod';
import { packTables } from '../crystals/matrix.ts';
import type { Fault } from '../problem.ts';
import { Reach } from '../schemas/reach.ts';
import { faultsOf } from '../validation.ts';
import { fileStem } from './file-stem.ts';

const MOST_CURVES = 200;
/** As POST /v1/comparisons has it. */
const DEFAULT_TOLERANCE = 0.05;

export interface PlannedCurve {
  readonly name: string;
  /** What its files are called, without an ending. */
  readonly stem: string;
  readonly tolerance: number;
  /** The body of POST /v1/reach, as it stands in the plan. */
  readonly asked: unknown;
  readonly masses: number;
}

export interface Plan {
  /** As it was read, for the history. */
  readonly text: string;
  readonly curves: readonly PlannedCurve[];
}

export class PlanError extends Error {
  readonly faults: readonly Fault[];
  constructor(detail: string, faults: readonly Fault[] = []) {
    super(detail);
    this.faults = faults;
  }
}

const Tolerance = z.number().min(0).max(1e6);

/** Neither control characters nor halves of characters: it is printed on terminals and in figures. */
const Name = z
  .string()
  .max(100)
  .refine((name) => name.trim() !== '' && name.trim() === name, 'must not be blank, nor begin or end with blanks')
  .refine((name) => !/[\p{Cc}\p{Cs}\u2028\u2029\ufffe\uffff]/u.test(name), 'must be one line of plain characters');

const PlanFile = z
  .strictObject({
    tolerance: Tolerance.default(DEFAULT_TOLERANCE),
    curves: z
      .array(z.strictObject({ name: Name, reach: Reach, tolerance: Tolerance.optional() }))
      .min(1)
      .max(MOST_CURVES),
  })
  .superRefine(checkNames, { when: () => true });

/** Runs on whatever could be read, so that a name given twice is told along with the other faults. */
function checkNames(input: unknown, context: z.RefinementCtx): void {
  const curves = (input as { curves?: unknown } | null)?.curves;
  if (!Array.isArray(curves)) return;
  const seen = new Map<string, number>();
  curves.forEach((curve: { name?: unknown } | null, i) => {
    if (typeof curve?.name !== 'string') return;
    const stem = fileStem(curve.name);
    const first = seen.get(stem);
    if (first === undefined) seen.set(stem, i);
    else
      context.addIssue({
        code: 'custom',
        path: ['curves', i, 'name'],
        message: `is the name of curve ${first} already`,
      });
  });
}

/** @throws PlanError with every fault. */
export function planOf(text: string): Plan {
  const input = jsonOf(text);
  const result = PlanFile.safeParse(withPackedTables(input));
  if (!result.success) {
    const faults = faultsOf(result.error);
    throw new PlanError(`The plan has ${faults.length === 1 ? '1 fault' : `${faults.length} faults`}.`, faults);
  }
  const { tolerance, curves } = result.data;
  const asWritten = (input as { curves: { reach: unknown }[] }).curves;
  return {
    text,
    curves: curves.map((curve, i) => ({
      name: curve.name,
      stem: fileStem(curve.name),
      tolerance: curve.tolerance ?? tolerance,
      asked: asWritten[i].reach,
      masses: curve.reach.massesMev.length,
    })),
  };
}

/** A copy in which inline tables are as the schema takes them; the requests themselves go out as they were written. */
function withPackedTables(input: unknown): unknown {
  const copy = structuredClone(input);
  const curves = (copy as { curves?: unknown } | null)?.curves;
  if (Array.isArray(curves)) for (const curve of curves as ({ reach?: unknown } | null)[]) packTables(curve?.reach);
  return copy;
}

function jsonOf(text: string): unknown {
  try {
    return JSON.parse(text.replace(/^\ufeff/, ''));
  } catch (error) {
    throw new PlanError(`The plan is not JSON: ${(error as Error).message}`);
  }
}
