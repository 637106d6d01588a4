/** Ticks and labels of a logarithmic axis. */
import { scaleLinear } from 'd3-scale';

export interface Tick {
  readonly value: number;
  readonly isMajor: boolean;
  /** Text of the label; none at an unlabelled tick. */
  readonly label?: TickLabel;
}

/** "10" with the exponent "−38", or a plain number with none. */
export interface TickLabel {
  readonly base: string;
  readonly exponent?: string;
}

export interface AxisRange {
  readonly from: number;
  readonly to: number;
}

/** Decades between labels that a reader counts in. */
const STEPS = [1, 2, 3, 5, 10, 20, 30, 50, 100];
const SHARES = [2, 3, 4, 5, 6, 7, 8, 9];
/** Labelled, with the powers, where there are fewer than two of those: at least two of them lie in a range of a factor 3. */
const LABELLED_SHARES = [2, 3, 5];
/** A narrower range than this factor is divided evenly. */
const NARROW = 3;
const NARROW_TICKS = 5;
/** Units a decade must have for its subdivisions to be told apart. */
const SUBDIVIDED_FROM = 36;
/** Exponents of numbers that are written out. */
const WRITTEN_OUT = { from: -3, to: 4 };

/**
 * The ticks of a range, ascending. Powers of ten are labelled as often as `labelUnits` leaves room for; those are major. Between them 2…9
 * where there is room, or else the other powers. A range with fewer than two powers of ten has plain numbers.
 *
 * @param range positive, finite, from < to. @param length of the axis. @param labelUnits that a label needs, same unit.
 */
export function logTicks(range: AxisRange, length: number, labelUnits: number): Tick[] {
  const inside = ({ value }: { value: number }): boolean => value >= range.from && value <= range.to;
  if (range.to / range.from < NARROW) return evenTicks(range);
  const exponents = exponentsAround(range);
  const isShort = exponents.filter((exponent) => inside({ value: decimal(1, exponent) })).length < 2;
  const unitsPerDecade = length / (Math.log10(range.to) - Math.log10(range.from));
  const ticks = isShort ? exponents.flatMap(shortDecade) : decades(exponents, unitsPerDecade, labelUnits);
  return ticks.filter(inside);
}

function exponentsAround({ from, to }: AxisRange): number[] {
  const [first, last] = [Math.floor(Math.log10(from)) - 1, Math.ceil(Math.log10(to))];
  return Array.from({ length: last - first + 1 }, (_, i) => first + i);
}

function decades(exponents: readonly number[], unitsPerDecade: number, labelUnits: number): Tick[] {
  const step = STEPS.find((count) => count * unitsPerDecade >= labelUnits) ?? STEPS[STEPS.length - 1];
  return exponents.flatMap((exponent): Tick[] => {
    const value = decimal(1, exponent);
    const isMajor = exponent % step === 0;
    const power: Tick = isMajor ? { value, isMajor, label: powerLabel(exponent) } : { value, isMajor };
    const between = SHARES.map((share): Tick => ({ value: decimal(share, exponent), isMajor: false }));
    return unitsPerDecade >= SUBDIVIDED_FROM ? [power, ...between] : [power];
  });
}

function shortDecade(exponent: number): Tick[] {
  return [1, ...SHARES].map((share): Tick => {
    const value = decimal(share, exponent);
    const isMajor = share === 1 || LABELLED_SHARES.includes(share);
    return isMajor ? { value, isMajor, label: numberLabel(share, exponent) } : { value, isMajor };
  });
}

function evenTicks({ from, to }: AxisRange): Tick[] {
  return scaleLinear([from, to], [0, 1])
    .ticks(NARROW_TICKS)
    .map((value): Tick => {
      const [share, exponent] = value.toExponential(10).split('e').map(Number);
      return { value, isMajor: true, label: numberLabel(share, exponent) };
    });
}

/** share × 10^exponent by way of decimal text: exactly the number a reader would type. */
function decimal(share: number, exponent: number): number {
  return Number(`${share}e${exponent}`);
}

function powerLabel(exponent: number): TickLabel {
  return { base: '10', exponent: signed(exponent) };
}

function numberLabel(share: number, exponent: number): TickLabel {
  if (exponent >= WRITTEN_OUT.from && exponent <= WRITTEN_OUT.to) return { base: String(decimal(share, exponent)) };
  return { base: share === 1 ? '10' : `${share} · 10`, exponent: signed(exponent) };
}

function signed(exponent: number): string {
  return exponent < 0 ? `−${-exponent}` : String(exponent);
}
