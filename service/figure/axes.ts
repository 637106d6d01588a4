/** The two axes: lines, ticks, numbers, names and the hairlines through the plot. */
import { type Box, MARGIN, type Scales, SIZE } from './layout.ts';
import { HAIRLINE, INK } from './line-style.ts';
import type { Tick, TickLabel } from './log-axis.ts';
import { element, fixed, type Markup, textAt } from './xml.ts';

/** Through the powers of ten, behind everything. */
export function hairlines(xTicks: readonly Tick[], yTicks: readonly Tick[], { x, y }: Scales, box: Box): Markup[] {
  const stroke = { stroke: HAIRLINE, 'stroke-width': 0.8 };
  const major = (ticks: readonly Tick[]): number[] => ticks.filter((t) => t.isMajor).map((t) => t.value);
  return [
    ...major(xTicks).map((value) =>
      element('line', { x1: x(value), x2: x(value), y1: box.top, y2: box.bottom, ...stroke }),
    ),
    ...major(yTicks).map((value) =>
      element('line', { x1: box.left, x2: box.right, y1: y(value), y2: y(value), ...stroke }),
    ),
  ];
}

/** The name of the vertical axis stands above it, where it needs no turning of the head and meets no number. */
export function axesOf(xTicks: readonly Tick[], yTicks: readonly Tick[], { x, y }: Scales, box: Box): Markup[] {
  const length = ({ isMajor }: Tick): number => (isMajor ? 7 : 4);
  const ticks = [
    ...xTicks.map((tick) => `M${fixed(x(tick.value))} ${fixed(box.bottom)}v${length(tick)}`),
    ...yTicks.map((tick) => `M${fixed(box.left)} ${fixed(y(tick.value))}h${-length(tick)}`),
  ].join('');
  const frame = `M${fixed(box.left)} ${fixed(box.top)}V${fixed(box.bottom)}H${fixed(box.right)}`;
  const size = { 'font-size': SIZE.tick };
  return [
    element('path', { d: frame + ticks, fill: 'none', stroke: INK, 'stroke-width': 1.1 }),
    ...xTicks.flatMap(({ value, label }) =>
      label ? [textAt(x(value), box.bottom + 24, tickText(label), { ...size, 'text-anchor': 'middle' })] : [],
    ),
    ...yTicks.flatMap(({ value, label }) =>
      label ? [textAt(box.left - 11, y(value) + 5, tickText(label), { ...size, 'text-anchor': 'end' })] : [],
    ),
    textAt((box.left + box.right) / 2, box.bottom + 43, massTitle(), {
      'font-size': SIZE.axis,
      'text-anchor': 'middle',
    }),
    textAt(MARGIN, box.top - 18, crossSectionTitle(), { 'font-size': SIZE.axis }),
  ];
}

function tickText({ base, exponent }: TickLabel): Markup {
  const raised =
    exponent === undefined ? '' : element('tspan', { dy: -6, 'font-size': SIZE.exponent }, exponent).markup;
  return { markup: base + raised };
}

/** Unicode has no subscript χ that every font knows. */
function subscript(text: string): string {
  return element('tspan', { dy: 3.5, 'font-size': SIZE.exponent }, text).markup;
}

function massTitle(): Markup {
  return {
    markup: `Dark-matter mass <tspan font-style="italic">m</tspan>${subscript('χ')}<tspan dy="-3.5"> (MeV)</tspan>`,
  };
}

function crossSectionTitle(): Markup {
  return { markup: `Cross section σ\u0304${subscript('e')}<tspan dy="-3.5"> (cm²)</tspan>` };
}
