/** The names of the curves below the plot. */
import { BAND_STYLE, curveStroke, markerAt, referenceStroke, type Stroke } from './curves.ts';
import type { ReachFigure } from './figure-input.ts';
import { significant } from './figure-words.ts';
import { INNER, LEGEND, MARGIN, SIZE } from './layout.ts';
import { CURVE_STYLES, type LineStyle, MUTED_INK } from './line-style.ts';
import { shortened, textWidth } from './text-width.ts';
import { element, type Markup, textAt } from './xml.ts';

/** A line of the legend. */
interface LegendEntry {
  readonly name: string;
  /** Muted, after the name. */
  readonly remark: string;
  readonly sample: (x: number, y: number) => Markup[];
}

export function legendEntries({ curves, references = [], band }: ReachFigure): LegendEntry[] {
  return [
    ...curves.map(({ name, lightestMassMev }, i) => ({
      name,
      remark: lightestMassMev === undefined ? '' : ` · edge at ${significant(lightestMassMev)} MeV`,
      sample: curveSample(CURVE_STYLES[i]),
    })),
    ...(band ? [{ name: band.name, remark: '', sample: bandSample }] : []),
    ...references.map(({ name }, i) => ({ name, remark: '', sample: lineSample(referenceStroke(i)) })),
  ];
}

function lineSample(stroke: Stroke): LegendEntry['sample'] {
  return (x, y) => [element('line', { x1: x, x2: x + LEGEND.sample, y1: y, y2: y, ...stroke })];
}

function curveSample(style: LineStyle): LegendEntry['sample'] {
  return (x, y) => [...lineSample(curveStroke(style))(x, y), markerAt(x + LEGEND.sample / 2, y, style)];
}

function bandSample(x: number, y: number): Markup[] {
  return [element('rect', { x, y: y - 6, width: LEGEND.sample, height: 12, ...BAND_STYLE })];
}

/** In two columns where every name fits into one, in one column otherwise; what does not fit there is shortened. */
export function legendLayout(entries: readonly LegendEntry[]): { rows: number; draw: (top: number) => Markup[] } {
  const besides = LEGEND.sample + LEGEND.gap;
  const widest = Math.max(...entries.map(({ name, remark }) => textWidth(name + remark, SIZE.legend)));
  const half = (INNER - LEGEND.columnGap) / 2;
  const columns = entries.length > 1 && widest <= half - besides ? 2 : 1;
  const rows = Math.ceil(entries.length / columns);
  const room = (columns === 2 ? half : INNER) - besides;
  const draw = (top: number): Markup[] =>
    entries.flatMap((entry, i) => {
      const x = MARGIN + Math.floor(i / rows) * (half + LEGEND.columnGap);
      const y = top + (i % rows) * LEGEND.row + 4;
      return [
        ...entry.sample(x, y),
        textAt(x + besides, y + 4.5, legendText(entry, room), { 'font-size': SIZE.legend }),
      ];
    });
  return { rows, draw };
}

function legendText({ name, remark }: LegendEntry, room: number): Markup {
  const fitting = shortened(name, SIZE.legend, room - textWidth(remark, SIZE.legend));
  const parts = [element('tspan', {}, fitting), ...(remark ? [element('tspan', { fill: MUTED_INK }, remark)] : [])];
  return { markup: parts.map((part) => part.markup).join('') };
}
