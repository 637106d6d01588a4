/** What is drawn inside the axes: lines, markers, the mark of the lightest mass, a band. */
import type { ScaleLogarithmic } from 'd3-scale';
import { area, line, type SymbolType, symbol } from 'd3-shape';
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';
import { byMass, type FigureBand, type FigureCurve } from './figure-input.ts';
import type { Box, Scales } from './layout.ts';
import { BAND_FILL, type LineStyle, REFERENCE_COLOR, REFERENCE_DASHES } from './line-style.ts';
import type { AxisRange } from './log-axis.ts';
import { element, fixed, type Markup } from './xml.ts';

/** Units between markers along the mass axis, and the size of one. */
const MARKER_SPACING = 26;
const MARKER_AREA = 34;

export type Stroke = Readonly<Record<string, string | number | undefined>>;

export function curveStroke({ color, dashes }: LineStyle): Stroke {
  return { stroke: color, 'stroke-width': 2, 'stroke-dasharray': dashes, 'stroke-linejoin': 'round' };
}

export function referenceStroke(index: number): Stroke {
  return {
    stroke: REFERENCE_COLOR,
    'stroke-width': 1.6,
    'stroke-dasharray': REFERENCE_DASHES[index],
    'stroke-linejoin': 'round',
  };
}

export function curvePath({ points }: FigureCurve, { x, y }: Scales, stroke: Stroke): Markup {
  const path = line<CurvePoint>()
    .defined((point) => point.crossSectionCm2 !== null)
    .x((point) => x(point.massMev))
    .y((point) => y(point.crossSectionCm2!))
    .digits(2);
  return element('path', { d: path(byMass(points)) ?? '', fill: 'none', ...stroke });
}

/** A marker at the ends of every piece, and between them as often as they keep their distance. A lone point is its marker. */
export function markersOf(curve: FigureCurve, { x, y }: Scales, style: LineStyle): Markup[] {
  const points = byMass(curve.points);
  const isReached = (i: number): boolean => points[i] !== undefined && points[i].crossSectionCm2 !== null;
  const reached = points.flatMap((_, i) => (isReached(i) ? [i] : []));
  const isEnd = (i: number): boolean => !isReached(i - 1) || !isReached(i + 1);
  const at = (i: number): number => x(points[i].massMev);
  const marked: number[] = [];
  for (const i of reached) {
    const nextEnd = reached.find((j) => j > i && isEnd(j));
    const isApart = (j: number | undefined): boolean => j === undefined || Math.abs(at(i) - at(j)) >= MARKER_SPACING;
    if (isEnd(i) || (isApart(marked[marked.length - 1]) && isApart(nextEnd))) marked.push(i);
  }
  return marked.map((i) => markerAt(at(i), y(points[i].crossSectionCm2!), style));
}

export function markerAt(x: number, y: number, { color, marker, isMarkerFilled }: LineStyle): Markup {
  return element('path', {
    d: markerPath(marker),
    transform: `translate(${fixed(x)} ${fixed(y)})`,
    fill: isMarkerFilled ? color : '#ffffff',
    stroke: color,
    'stroke-width': 1.3,
  });
}

function markerPath(marker: SymbolType): string {
  return symbol(marker, MARKER_AREA).digits(2)() ?? '';
}

/** Where the reach begins exactly: a dotted line, and a wedge on the axis. */
export function edgeMark(
  { lightestMassMev: edge }: FigureCurve,
  masses: AxisRange,
  x: ScaleLogarithmic<number, number>,
  { color }: LineStyle,
  box: Box,
): Markup[] {
  if (edge === undefined || edge < masses.from || edge > masses.to) return [];
  const at = x(edge);
  return [
    element('line', {
      x1: at,
      x2: at,
      y1: box.top,
      y2: box.bottom,
      stroke: color,
      'stroke-width': 1,
      'stroke-dasharray': '1 4',
      'stroke-linecap': 'round',
    }),
    element('path', { d: `M${fixed(at)} ${fixed(box.bottom - 9)}l4 9h-8z`, fill: color }),
  ];
}

export function bandOf({ points }: FigureBand, { x, y }: Scales): Markup[] {
  const path = area<FigureBand['points'][number]>()
    .defined((point) => point.lowestCm2 !== null && point.highestCm2 !== null)
    .x((point) => x(point.massMev))
    .y0((point) => y(point.lowestCm2!))
    .y1((point) => y(point.highestCm2!))
    .digits(2);
  return [element('path', { d: path(byMass(points)) ?? '', ...BAND_STYLE })];
}

export const BAND_STYLE = {
  fill: BAND_FILL,
  'fill-opacity': 0.16,
  stroke: BAND_FILL,
  'stroke-opacity': 0.35,
  'stroke-width': 0.8,
};
