/**
 * Measures of a reach figure, in units of which a width has 480 whatever its size in pixels: printed in a column of 8 cm, the numbers at
 * the axes are 6.6 point.
 */
import type { ScaleLogarithmic } from 'd3-scale';

export const WIDTH = 480;
export const MARGIN = 14;
export const INNER = WIDTH - 2 * MARGIN;
export const PLOT = { left: 66, right: WIDTH - 18, height: 280, lowest: 100 };
export const SIZE = { title: 17, subtitle: 13, tick: 14, exponent: 11, axis: 14.5, legend: 13.5, note: 12 };
/** From the last line of the head to the plot, and from the plot to the legend. */
export const ABOVE_PLOT = 26;
export const BELOW_PLOT = 60;
export const LEGEND = { row: 20, sample: 40, gap: 8, columnGap: 14 };
export const NOTE = { line: 15, above: 10 };
/** Room that a number at an axis takes. */
export const TICK_ROOM = { x: 46, y: 26 };

export interface Box {
  readonly left: number;
  readonly right: number;
  readonly top: number;
  readonly bottom: number;
}

export interface Scales {
  readonly x: ScaleLogarithmic<number, number>;
  readonly y: ScaleLogarithmic<number, number>;
}
