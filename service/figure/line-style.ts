/**
 * How curves are told apart: by colour on a screen, by dashes and markers in grey. The hues are those of M. Okabe and K. Ito, "Color
 * Universal Design" (2008), which are distinct to readers with any of the usual colour-vision deficiencies, darkened for thin lines on
 * white paper and put into our own order, neighbours of different lightness.
 */
import {
  type SymbolType,
  symbolCircle,
  symbolCross,
  symbolDiamond,
  symbolSquare,
  symbolStar,
  symbolTriangle,
  symbolWye,
} from 'd3-shape';

export interface LineStyle {
  readonly color: string;
  /** SVG dash array; none for a solid line. */
  readonly dashes?: string;
  readonly marker: SymbolType;
  readonly isMarkerFilled: boolean;
}

export const CURVE_STYLES: readonly LineStyle[] = [
  { color: '#00527f', marker: symbolCircle, isMarkerFilled: true },
  { color: '#c24e00', dashes: '10 4', marker: symbolSquare, isMarkerFilled: false },
  { color: '#00664b', dashes: '2.5 3', marker: symbolTriangle, isMarkerFilled: true },
  { color: '#b0608c', dashes: '11 3 2.5 3', marker: symbolDiamond, isMarkerFilled: false },
  { color: '#3a3f45', dashes: '6 2.5', marker: symbolCross, isMarkerFilled: true },
  { color: '#a87400', marker: symbolCircle, isMarkerFilled: false },
  { color: '#2f86b8', dashes: '14 3 2.5 3 2.5 3', marker: symbolStar, isMarkerFilled: true },
  { color: '#7a6a00', dashes: '4 2.5', marker: symbolWye, isMarkerFilled: true },
];

/** References lie behind and tell apart by their dashes. */
export const REFERENCE_COLOR = '#99a0a8';
export const REFERENCE_DASHES: readonly (string | undefined)[] = [undefined, '7 3.5', '2 3', '9 3 2 3'];

export const INK = '#1c2530';
export const MUTED_INK = '#55606c';
export const HAIRLINE = '#e4e8ec';
export const ACCENT = '#0f6a6f';
export const BAND_FILL = '#00527f';
