/** A crystal form factor table as it comes in, and its description as it goes out. */
import { z } from 'zod';
import { cellMassOfFormulaGev } from '../../physics/crystal/atomic-weights.ts';
import type { AxisKind, TableQuantity } from '../../physics/crystal/crystal-table.ts';
import type { QuantityKind } from '../../physics/quantity/quantity.ts';
import { QuantityError, quantityOf } from '../../physics/quantity/quantity.ts';
import { contentOf, idOf } from '../crystals/crystal-record.ts';
import { whereLossIsLost } from '../crystals/given-table.ts';
import { DIELECTRIC_PARTS, isPackedMatrix, MATRIX_FIELDS, type PackedMatrix } from '../crystals/matrix.ts';
import { Quality } from './quality.ts';
import { ABOVE_ZERO, AT_LEAST_ZERO, KINDS, quantity, quantityOut } from './quantity.ts';

const MOST_AXIS_NUMBERS = 100_000;

export const AxisNumbers = z
  .union(
    [
      z.array(z.number()).min(2).max(MOST_AXIS_NUMBERS),
      z.strictObject({
        start: z.number().min(0),
        step: z.number().positive(),
        count: z.int().min(2).max(MOST_AXIS_NUMBERS),
      }),
    ],
    { error: () => 'must be a list of numbers or {"start": …, "step": …, "count": …}' },
  )
  .meta({
    id: 'AxisNumbers',
    description: 'Strictly increasing numbers of at least 0: a list, or start + i·step for i = 0 … count − 1.',
  });

export function axisNumbersOf(given: z.output<typeof AxisNumbers>): readonly number[] {
  return Array.isArray(given) ? given : Array.from({ length: given.count }, (_, i) => given.start + i * given.step);
}

interface Axis {
  /** As it was written. */
  readonly unit: string;
  readonly kind: AxisKind;
  readonly values: readonly number[];
}

/** An axis with its unit, turned into numbers of the fixed unit. */
function axis(id: string, of: QuantityKind, what: string) {
  return z
    .strictObject({
      unit: z
        .string()
        .max(64)
        .meta({ examples: [of.unit] }),
      edges: AxisNumbers.optional().meta({
        description: 'N + 1 numbers: a value is the mean over its cell and constant in it.',
      }),
      points: AxisNumbers.optional().meta({ description: 'N numbers: values are samples, bilinear between them.' }),
    })
    .meta({ id, description: `${what} Exactly one of edges and points; both axes of a table of the same kind.` })
    .transform((input, context): Axis => {
      const kind: AxisKind = input.edges ? 'edges' : 'points';
      const given = input[kind];
      if (!given || (input.edges && input.points)) {
        context.addIssue({ code: 'custom', message: 'needs exactly one of "edges" and "points"' });
        return z.NEVER;
      }
      let factor = Number.NaN;
      try {
        factor = quantityOf(1, input.unit, of);
      } catch (error) {
        if (!(error instanceof QuantityError)) throw error;
        context.addIssue({ code: 'custom', path: ['unit'], message: error.message });
      }
      const numbers = axisNumbersOf(given);
      const values = Number.isNaN(factor) ? numbers : numbers.map((value) => value * factor);
      const offender = values.findIndex(
        (value, i) => !(value >= 0 && value < Infinity) || (i > 0 && !(value > values[i - 1])),
      );
      if (offender >= 0) {
        const path = Array.isArray(given) ? [kind, offender] : [kind];
        const is = Number.isFinite(numbers[offender]) ? numbers[offender] : 'beyond all that can be held';
        const message = `must be finite, at least 0 and strictly increasing; number ${offender} is ${is}`;
        context.addIssue({ code: 'custom', path, message });
      }
      return { unit: input.unit, kind, values };
    });
}

/** Text that has a UTF-8 form, and so a hash. */
const wholeText = (text: string): boolean => !/\p{Surrogate}/u.test(text);
const WHOLE_TEXT = 'must be whole Unicode characters; half a surrogate pair is none';

const Matrix = z
  .custom<PackedMatrix>(isPackedMatrix, { error: () => 'must be a list of rows, one for each momentum, of numbers' })
  .meta({ id: 'Matrix', description: 'One row a momentum, one column an energy; finite numbers of at least 0.' });

const RealMatrix = z
  .custom<PackedMatrix>(isPackedMatrix, { error: () => 'must be a list of rows, one for each momentum, of numbers' })
  .meta({ id: 'RealMatrix', description: 'One row a momentum, one column an energy; finite numbers.' });

const CellMass = z
  .union(
    [
      z.strictObject({
        formula: z
          .string()
          .min(1)
          .max(100)
          .meta({ examples: ['Si2'] }),
      }),
      quantity('CellMassQuantity', KINDS.cellMass, ABOVE_ZERO, 'Mass of the unit cell.'),
    ],
    { error: () => 'must be a mass with its unit, such as "52.32 GeV", or {"formula": "Si2"}' },
  )
  .meta({ id: 'CellMass', description: 'Mass of the unit cell, or its composition: standard atomic weights.' })
  .transform((input, context): number => {
    if (typeof input === 'number') return input;
    try {
      return cellMassOfFormulaGev(input.formula);
    } catch (error) {
      if (!(error instanceof RangeError)) throw error;
      context.addIssue({ code: 'custom', path: ['formula'], message: error.message });
      return z.NEVER;
    }
  });

/** What a table says of itself beside its numbers; fixed units: GeV, Å³, eV, keV. */
export interface CrystalHeader {
  readonly name: string;
  readonly source?: string;
  readonly screened: boolean;
  readonly quantity: TableQuantity | 'dielectricFunction';
  readonly axes: AxisKind;
  readonly cellMassGev: number;
  readonly cellVolumeAngstrom3?: number;
  readonly electronsPerCell?: number;
  readonly bandGapEv?: number;
  readonly energyPerPairEv?: number;
  readonly momentumKev: readonly number[];
  readonly energyEv: readonly number[];
}

export interface CrystalInput {
  /** SHA-256 of the canonical content (crystals/crystal-record). */
  readonly id: string;
  readonly header: CrystalHeader;
  /** Row-major, on shared memory. */
  readonly values: Float64Array;
  /** The unit in which momenta were sent: no part of the table, but of what its quality report asks. */
  readonly momentumUnit?: string;
  /** What was found out of an uploaded file rather than said by the caller. */
  readonly inferred?: readonly string[];
}

export const tableFields = z
  .strictObject({
    name: z.string().min(1).max(200).refine(wholeText, WHOLE_TEXT),
    source: z
      .string()
      .max(5000)
      .refine(wholeText, WHOLE_TEXT)
      .optional()
      .meta({ description: 'Where the numbers come from.' }),
    screened: z
      .boolean()
      .default(false)
      .meta({ description: 'Whether in-medium screening is in the numbers. A loss function is screened by nature.' }),
    cellMass: CellMass,
    cellVolume: quantity(
      'CellVolume',
      KINDS.volume,
      ABOVE_ZERO,
      'Volume of the unit cell; a loss function needs it.',
    ).optional(),
    electronsPerCell: z
      .number()
      .positive()
      .optional()
      .meta({ description: 'Electrons per cell that the table describes, 8 for the valence of silicon.' }),
    bandGap: quantity('BandGap', KINDS.energy, AT_LEAST_ZERO, 'Band gap.').optional(),
    energyPerPair: quantity(
      'EnergyPerPair',
      KINDS.energy,
      ABOVE_ZERO,
      'Mean energy per electron-hole pair.',
    ).optional(),
    momentum: axis('MomentumAxis', KINDS.momentum, 'Momentum transfer.'),
    energy: axis('EnergyAxis', KINDS.energy, 'Energy transfer.'),
    formFactorSquared: Matrix.optional().meta({ description: 'Crystal form factor |f(q, E)|², dimensionless.' }),
    lossFunction: Matrix.optional().meta({ description: 'Loss function Im[−1/ε(q, E)], dimensionless.' }),
    dielectricFunction: z
      .strictObject({ real: RealMatrix, imaginary: Matrix })
      .meta({
        id: 'DielectricFunction',
        description:
          'Dielectric function ε(q, E): as given, rates are those of its loss function; with "screening": "none", those of Im ε.',
      })
      .optional(),
  })
  .superRefine(checkTable, { when: () => true })
  .meta({
    id: 'CrystalTable',
    description:
      'A crystal form factor table: exactly one of formFactorSquared, lossFunction and dielectricFunction on a grid of momentum and energy.',
  });

type TableFields = {
  momentum?: Axis;
  energy?: Axis;
  cellVolume?: number;
  bandGap?: number;
  energyPerPair?: number;
} & TableMatrices;

interface TableMatrices {
  readonly formFactorSquared?: PackedMatrix | undefined;
  readonly lossFunction?: PackedMatrix | undefined;
  readonly dielectricFunction?: { readonly real?: PackedMatrix; readonly imaginary?: PackedMatrix } | undefined;
}

const QUANTITIES = [...MATRIX_FIELDS, 'dielectricFunction'] as const;

/** The matrices that are there, and where. */
function matricesOf(table: TableMatrices): [string[], PackedMatrix][] {
  const single = MATRIX_FIELDS.map((field) => [[field], table[field]] as const);
  const parts = DIELECTRIC_PARTS.map(
    ([part]) => [['dielectricFunction', part], table.dielectricFunction?.[part]] as const,
  );
  return [...single, ...parts].flatMap(([path, matrix]) => (matrix === undefined ? [] : [[[...path], matrix]]));
}

/** Faults between fields. Runs on whatever could be read, so that all faults come at once. */
function checkTable(input: unknown, context: z.RefinementCtx): void {
  if (typeof input !== 'object' || input === null || Array.isArray(input)) return;
  const table = input as TableFields;
  const issue = (path: (string | number)[], message: string): void =>
    context.addIssue({ code: 'custom', path, message });
  const given = QUANTITIES.filter((field) => table[field] !== undefined);
  if (given.length !== 1)
    issue(
      [],
      `needs exactly one of "formFactorSquared", "lossFunction" and "dielectricFunction"; got ${given.length || 'none'}`,
    );
  for (const [field, name] of [
    ['lossFunction', 'loss'],
    ['dielectricFunction', 'dielectric'],
  ] as const)
    if (table[field] !== undefined && table.cellVolume === undefined)
      issue(['cellVolume'], `a ${name} function needs the volume of the cell`);
  const read = (field: string): boolean => !context.issues.some(({ path }) => path?.[0] === field);
  if (
    typeof table.bandGap === 'number' &&
    typeof table.energyPerPair === 'number' &&
    read('bandGap') &&
    read('energyPerPair') &&
    table.energyPerPair < table.bandGap
  ) {
    issue(['energyPerPair'], `must be at least the band gap, ${table.bandGap} eV`);
  }
  const axisOf = (value: unknown): Axis | undefined =>
    Array.isArray((value as Axis | undefined)?.values) ? (value as Axis) : undefined;
  const [momentum, energy] = [axisOf(table.momentum), axisOf(table.energy)];
  if (momentum && energy && momentum.kind !== energy.kind)
    issue(['energy'], `must have ${momentum.kind} like the momentum axis`);
  const cells = (axis: Axis): number => (axis.kind === 'edges' ? axis.values.length - 1 : axis.values.length);
  for (const [name, axis] of [
    ['momentum', momentum],
    ['energy', energy],
  ] as const) {
    if (axis && cells(axis) < 2) issue([name], 'too short: a table has at least 2 × 2 values');
  }
  for (const [field, matrix] of matricesOf(table)) {
    if (!isPackedMatrix(matrix)) continue;
    const numberOf = (pointer: string): (string | number)[] => [...field, ...pointer.split('/').slice(1).map(Number)];
    for (const fault of matrix.faults) issue(numberOf(fault.pointer), fault.detail);
    if (matrix.faultCount > matrix.faults.length) issue(field, `${matrix.faultCount} faulty values or rows in all`);
    if (momentum && matrix.rowLengths.length !== cells(momentum)) {
      issue(field, `has ${matrix.rowLengths.length} rows; the momentum axis makes ${cells(momentum)}`);
    }
    const columns = energy ? cells(energy) : matrix.rowLengths[0];
    const why = energy ? 'the energy axis makes' : 'the first row has';
    let ragged = 0;
    matrix.rowLengths.forEach((length, i) => {
      if (length >= 0 && length !== columns && ragged++ < 10)
        issue([...field, i], `has ${length} numbers; ${why} ${columns}`);
    });
  }
}

/** Matrices as one array, on shared memory. */
function oneAfterTheOther(matrices: readonly Float64Array[]): Float64Array {
  const size = matrices.reduce((sum, { length }) => sum + length, 0);
  const all = new Float64Array(new SharedArrayBuffer(8 * size));
  let at = 0;
  for (const matrix of matrices) {
    all.set(matrix, at);
    at += matrix.length;
  }
  return all;
}

/** A table in a request body (its matrix packed by crystals/matrix first) → header and values in fixed units. */
export const CrystalTableIn = tableFields.transform((table, context): CrystalInput => {
  const field = QUANTITIES.find((quantity) => table[quantity] !== undefined) ?? 'formFactorSquared';
  const given = matricesOf(table);
  const matrices = given.map(([, { values }]) => values);
  const lost = field === 'dielectricFunction' ? whereLossIsLost(matrices[0], matrices[1]) : -1;
  if (lost >= 0) {
    const [field, { rowLengths }] = given[1];
    const path = [...field, Math.floor(lost / rowLengths[0]), lost % rowLengths[0]];
    context.addIssue({ code: 'custom', path, message: 'is too near 0, like the real part: Im[−1/ε] cannot be held' });
    return z.NEVER;
  }
  const values = matrices.length === 1 ? matrices[0] : oneAfterTheOther(matrices);
  const header: CrystalHeader = {
    name: table.name,
    ...(table.source === undefined ? {} : { source: table.source }),
    screened: table.screened || field !== 'formFactorSquared',
    quantity: field,
    axes: table.momentum.kind,
    cellMassGev: table.cellMass,
    ...(table.cellVolume === undefined ? {} : { cellVolumeAngstrom3: table.cellVolume }),
    ...(table.electronsPerCell === undefined ? {} : { electronsPerCell: table.electronsPerCell }),
    ...(table.bandGap === undefined ? {} : { bandGapEv: table.bandGap }),
    ...(table.energyPerPair === undefined ? {} : { energyPerPairEv: table.energyPerPair }),
    momentumKev: table.momentum.values,
    energyEv: table.energy.values,
  };
  return { id: idOf(contentOf(header, values)), header, values, momentumUnit: table.momentum.unit };
});

const AxisSummary = z
  .strictObject({
    unit: z.string(),
    kind: z.enum(['edges', 'points']),
    count: z.int(),
    from: z.number(),
    to: z.number(),
  })
  .meta({ id: 'AxisSummary', description: 'How many numbers an axis has, and the first and last of them.' });

export const CrystalDescription = z
  .strictObject({
    id: z.string().meta({ description: 'SHA-256 of the canonical content, 64 hexadecimal digits.' }),
    aliases: z.array(z.string()),
    builtIn: z.boolean(),
    name: z.string(),
    source: z.string().optional(),
    accuracy: z
      .array(z.string())
      .optional()
      .meta({ description: 'What is stated about the accuracy of the numbers, for built-in tables.' }),
    quantity: z.enum(['formFactorSquared', 'lossFunction', 'dielectricFunction']),
    screened: z.boolean(),
    cellMass: quantityOut('GeV'),
    cellVolume: quantityOut('angstrom^3').optional(),
    electronsPerCell: z.number().optional(),
    bandGap: quantityOut('eV').optional(),
    energyPerPair: quantityOut('eV').optional(),
    momentum: AxisSummary,
    energy: AxisSummary,
    inferred: z
      .array(z.string())
      .optional()
      .meta({ description: 'In the answer to an upload: what was found out of the file rather than said.' }),
    quality: Quality.optional().meta({ description: 'In the description of one table; the list goes without.' }),
    links: z.strictObject({ self: z.string(), values: z.string() }),
  })
  .meta({ id: 'CrystalDescription', description: 'A stored table without its values.' });

export const CrystalList = z.strictObject({ crystals: z.array(CrystalDescription) }).meta({ id: 'CrystalList' });

const ValuesAxis = z.strictObject({
  unit: z.string(),
  edges: z.array(z.number()).optional(),
  points: z.array(z.number()).optional(),
});

export const CrystalValues = z
  .strictObject({
    name: z.string(),
    source: z.string().optional(),
    screened: z.boolean(),
    cellMass: z.string(),
    cellVolume: z.string().optional(),
    electronsPerCell: z.number().optional(),
    bandGap: z.string().optional(),
    energyPerPair: z.string().optional(),
    momentum: ValuesAxis,
    energy: ValuesAxis,
    formFactorSquared: z.array(z.array(z.number())).optional(),
    lossFunction: z.array(z.array(z.number())).optional(),
    dielectricFunction: z
      .strictObject({ real: z.array(z.array(z.number())), imaginary: z.array(z.array(z.number())) })
      .optional(),
  })
  .meta({ id: 'CrystalValues', description: 'A whole table, in the form in which it can be posted.' });
