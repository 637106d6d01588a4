/**
 * Reach curves as an SVG figure that a proposal can print: smallest cross section against mass, both logarithmic.
 *
 * Straight pieces between points are the log–log interpolation that comparisons use; masses that are not reached leave gaps. No script,
 * style sheet, font or link; the same input gives the same bytes.
 */
import { scaleLog } from 'd3-scale';
import { DomainError } from '../../physics/errors.ts';
import { PLANNING_ESTIMATE } from '../planning-estimate.ts';
import { axesOf, hairlines } from './axes.ts';
import { bandOf, curvePath, curveStroke, edgeMark, markersOf, referenceStroke } from './curves.ts';
import { checkFigure, type ReachFigure } from './figure-input.ts';
import { descriptionOf } from './figure-words.ts';
import {
  ABOVE_PLOT,
  BELOW_PLOT,
  type Box,
  INNER,
  LEGEND,
  MARGIN,
  NOTE,
  PLOT,
  SIZE,
  TICK_ROOM,
  WIDTH,
} from './layout.ts';
import { legendEntries, legendLayout } from './legend.ts';
import { ACCENT, CURVE_STYLES, INK, MUTED_INK } from './line-style.ts';
import { type AxisRange, logTicks } from './log-axis.ts';
import { wrapped } from './text-width.ts';
import { element, lines, type Markup, textAt } from './xml.ts';

export type { FigureCurve, ReachFigure } from './figure-input.ts';

/** Generic, so that the figure depends on no font. */
const FONT = 'sans-serif';
const DEFAULT_WIDTH_PX = 720;

/**
 * The figure as SVG text.
 *
 * @throws DomainError for no curve or more than 8, more than 4 references, curves without points, numbers outside 1e-250…1e250, and a
 * height with no room for the contents.
 */
export function reachFigure(figure: ReachFigure): string {
  checkFigure(figure);
  const head = headOf(figure);
  const legend = legendLayout(legendEntries(figure));
  const note = wrapped(figure.note ?? PLANNING_ESTIMATE, SIZE.note, INNER, 3);
  const footHeight = BELOW_PLOT + legend.rows * LEGEND.row + NOTE.above + note.length * NOTE.line + MARGIN / 2;
  const widthPx = figure.widthPx ?? DEFAULT_WIDTH_PX;
  const height = heightOf(figure, widthPx, head.bottom + footHeight);
  const box = { left: PLOT.left, right: PLOT.right, top: head.bottom, bottom: height - footHeight };
  const legendTop = box.bottom + BELOW_PLOT;
  const content = [
    element('title', {}, figure.title),
    element('desc', {}, descriptionOf(figure)),
    element('rect', { width: WIDTH, height, fill: '#ffffff' }),
    ...head.markup,
    ...plotOf(figure, box),
    ...legend.draw(legendTop),
    ...note.map((text, i) =>
      textAt(MARGIN, legendTop + legend.rows * LEGEND.row + NOTE.above + i * NOTE.line + 4, text, {
        'font-size': SIZE.note,
        'font-style': 'italic',
        fill: MUTED_INK,
      }),
    ),
  ];
  const svg = element(
    'svg',
    {
      xmlns: 'http://www.w3.org/2000/svg',
      width: widthPx,
      height: figure.heightPx ?? (widthPx * height) / WIDTH,
      viewBox: `0 0 ${WIDTH} ${Number(height.toFixed(2))}`,
      role: 'img',
      'font-family': FONT,
      fill: INK,
    },
    lines(content),
    { markup: '\n' },
  );
  return `<?xml version="1.0" encoding="UTF-8"?>\n${svg.markup}\n`;
}

/** Height in drawing units; what is around the plot takes `others`. */
function heightOf({ heightPx }: ReachFigure, widthPx: number, others: number): number {
  if (heightPx === undefined) return others + PLOT.height;
  const height = (heightPx * WIDTH) / widthPx;
  if (height < others + PLOT.lowest) {
    const least = Math.ceil(((others + PLOT.lowest) * widthPx) / WIDTH);
    throw new DomainError('heightPx', heightPx, `at least ${least} at this width, with so much to name`);
  }
  return height;
}

/** Title and subtitle; `bottom` is where the plot begins. */
function headOf({ title, subtitle = '' }: ReachFigure): { markup: Markup[]; bottom: number } {
  const titleLines = wrapped(title, SIZE.title, INNER / 1.12, 2); // bold is wider
  const subtitleLines = wrapped(subtitle, SIZE.subtitle, INNER, 2);
  let y = MARGIN + 2;
  const markup = [element('rect', { x: MARGIN, y, width: 30, height: 3, fill: ACCENT })];
  y += 22;
  for (const text of titleLines) {
    markup.push(textAt(MARGIN, y, text, { 'font-size': SIZE.title, 'font-weight': 'bold' }));
    y += 21;
  }
  for (const text of subtitleLines) {
    markup.push(textAt(MARGIN, y, text, { 'font-size': SIZE.subtitle, fill: MUTED_INK }));
    y += 17;
  }
  return { markup, bottom: y + ABOVE_PLOT };
}

function plotOf(figure: ReachFigure, box: Box): Markup[] {
  const { curves, references = [], band } = figure;
  const masses = massRange(figure);
  const sigmas = crossSectionRange(figure);
  const x = scaleLog([masses.from, masses.to], [box.left, box.right]);
  const y = scaleLog([sigmas?.from ?? 1, sigmas?.to ?? 10], [box.bottom, box.top]);
  const scales = { x, y };
  const xTicks = logTicks(masses, box.right - box.left, TICK_ROOM.x);
  const yTicks = sigmas ? logTicks(sigmas, box.bottom - box.top, TICK_ROOM.y) : [];
  const drawn = [
    ...(band ? bandOf(band, scales) : []),
    ...references.map((curve, i) => curvePath(curve, scales, referenceStroke(i))),
    ...curves.flatMap((curve, i) => edgeMark(curve, masses, x, CURVE_STYLES[i], box)),
    ...curves.flatMap((curve, i) => [
      curvePath(curve, scales, curveStroke(CURVE_STYLES[i])),
      ...markersOf(curve, scales, CURVE_STYLES[i]),
    ]),
  ];
  return [
    ...hairlines(xTicks, yTicks, scales, box),
    clipped(box, drawn),
    ...axesOf(xTicks, yTicks, scales, box),
    ...(sigmas ? [] : [emptyText(box)]),
  ];
}

/** A nested viewport shows nothing outside itself, and needs no identifier that could clash with another figure's on one page. */
function clipped({ left, right, top, bottom }: Box, content: readonly Markup[]): Markup {
  const [width, height] = [right - left, bottom - top];
  const viewBox = [left, top, width, height].map((value) => Number(value.toFixed(2))).join(' ');
  return element('svg', { x: left, y: top, width, height, viewBox, overflow: 'hidden' }, lines(content));
}

/** All masses asked for, reached or not, and the lightest masses that lie just below them, with a little room. */
function massRange({ curves, references = [], band }: ReachFigure): AxisRange {
  const masses = [...curves, ...references, ...(band ? [band] : [])].flatMap((c) => c.points.map((p) => p.massMev));
  const [first, to] = [Math.min(...masses), Math.max(...masses)];
  const edges = curves.flatMap(({ lightestMassMev: edge }) => (edge && edge > first / 2 && edge < first ? [edge] : []));
  const from = Math.min(first, ...edges);
  const room = to > from ? Math.max(1.05, to ** 0.03 / from ** 0.03) : 2;
  return { from: from / room, to: to * room };
}

/** Whole decades around everything drawn; undefined where there is nothing. */
function crossSectionRange({
  curves,
  references = [],
  band,
  crossSectionRangeCm2,
}: ReachFigure): AxisRange | undefined {
  if (crossSectionRangeCm2) return crossSectionRangeCm2;
  const values = [
    ...[...curves, ...references].flatMap((curve) => curve.points.map((point) => point.crossSectionCm2)),
    ...(band?.points.flatMap((point) => [point.lowestCm2, point.highestCm2]) ?? []),
  ].filter((value) => value !== null);
  if (values.length === 0) return undefined;
  const [low, high] = [Math.log10(Math.min(...values)), Math.log10(Math.max(...values))];
  const from = Math.floor(low - 0.05);
  return { from: Number(`1e${from}`), to: Number(`1e${Math.max(from + 1, Math.ceil(high + 0.05))}`) };
}

function emptyText(box: Box): Markup {
  return textAt((box.left + box.right) / 2, (box.top + box.bottom) / 2, 'No mass in this range reaches the goal', {
    'font-size': SIZE.axis,
    'text-anchor': 'middle',
    fill: MUTED_INK,
  });
}
