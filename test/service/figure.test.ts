import { describe, expect, it } from 'vitest';
import { DomainError } from '../../physics/errors.ts';
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';
import { CURVE_STYLES, REFERENCE_DASHES } from '../../service/figure/line-style.ts';
import { logTicks, type Tick } from '../../service/figure/log-axis.ts';
import { type ReachFigure, reachFigure } from '../../service/figure/reach-figure.ts';
import { shortened, textWidth, wrapped } from '../../service/figure/text-width.ts';
import { escapeXml } from '../../service/figure/xml.ts';
import { PLANNING_ESTIMATE } from '../../service/planning-estimate.ts';
import { everyElement, textOf, type XmlElement, xmlTree } from '../support/xml-tree.ts';

function points(...pairs: [number, number | null][]): CurvePoint[] {
  return pairs.map(([massMev, crossSectionCm2]) => ({ massMev, crossSectionCm2 }));
}

const CURVE = points([1, null], [2, 3e-37], [5, 4e-39], [20, 1e-39], [100, 6e-39], [1000, 5e-38]);

function figure(change: Partial<ReachFigure> = {}): ReachFigure {
  return { title: 'Silicon', curves: [{ name: 'two electrons', points: CURVE, lightestMassMev: 1.403 }], ...change };
}

function drawn(change: Partial<ReachFigure> = {}): XmlElement[] {
  return everyElement(xmlTree(reachFigure(figure(change))));
}

const texts = (all: readonly XmlElement[]): string[] => all.filter(({ name }) => name === 'text').map(textOf);
/** Paths that are drawn as lines of this colour, markers (moved into place) and axes apart. */
const linesOf = (all: readonly XmlElement[], color: string): string[] =>
  all
    .filter(({ name, attributes: a }) => name === 'path' && a.stroke === color && a.fill === 'none')
    .map(({ attributes }) => attributes.d);
const markersOf = (all: readonly XmlElement[], color: string): string[] =>
  all.filter(({ attributes: a }) => a.stroke === color && a.transform).map(({ attributes }) => attributes.transform);

const HOSTILE = [
  '<script>alert(1)</script>',
  '"/><image href="http://invalid.invalid/x"/>',
  "' onload='alert(1)",
  '&lt; &#60; & ]]> <!-- --> <?x?>',
  'line\nbreak\ttab\u0000\u001b\ud800\ufffe\u2028end',
];

describe('reachFigure', () => {
  it('is one well-formed SVG with a name and a description, and says what the axes are', () => {
    const all = drawn({ subtitle: '90 % exclusion' });
    const [svg, title, desc] = all;
    expect(svg).toMatchObject({ name: 'svg', attributes: { role: 'img', width: '720' } });
    expect([title.name, title.text]).toEqual(['title', 'Silicon']);
    expect(desc.name).toBe('desc');
    expect(desc.text).toContain('two electrons: reached from 2 to 1000 MeV, lowest 1e-39 cm² at 20 MeV.');
    expect(desc.text).toContain('Nothing is reached up to 1.403 MeV.');
    expect(texts(all)).toEqual(
      expect.arrayContaining([
        'Silicon',
        '90 % exclusion',
        'Dark-matter mass mχ (MeV)',
        'Cross section σ̄e (cm²)',
        '100',
        '103',
        '10−37',
        'two electrons · edge at 1.403 MeV',
      ]),
    );
    expect(texts(all).join(' ')).toContain(PLANNING_ESTIMATE);
  });

  it('gives the same bytes for the same input, whatever the order of the points', () => {
    const once = reachFigure(figure());
    expect(reachFigure(figure())).toBe(once);
    const reversed = [{ name: 'two electrons', points: [...CURVE].reverse(), lightestMassMev: 1.403 }];
    expect(reachFigure(figure({ curves: reversed }))).toBe(once);
  });

  it('refers to nothing outside itself, and has no identifier that could clash', () => {
    const all = drawn({ references: [{ name: 'r', points: CURVE }] });
    const names = new Set(all.map(({ name }) => name));
    expect([...names].sort()).toEqual(['desc', 'line', 'path', 'rect', 'svg', 'text', 'title', 'tspan']);
    const attributes = new Set(all.flatMap((one) => Object.keys(one.attributes)));
    for (const forbidden of ['id', 'class', 'style', 'href', 'xlink:href', 'onload']) {
      expect(attributes).not.toContain(forbidden);
    }
    expect(reachFigure(figure()).match(/https?:/g)).toEqual(['http:']); // the namespace
  });

  it.each(HOSTILE)('shows a hostile name as text: %j', (name) => {
    const all = drawn({
      title: name,
      subtitle: name,
      note: name,
      curves: [{ name, points: CURVE }],
      references: [{ name, points: CURVE }],
      band: { name, points: [{ massMev: 1, lowestCm2: 1e-39, highestCm2: 1e-38 }] },
    });
    const plain = drawn({
      title: 'x',
      subtitle: 'x',
      note: 'x',
      curves: [{ name: 'x', points: CURVE }],
      references: [{ name: 'x', points: CURVE }],
      band: { name: 'x', points: [{ massMev: 1, lowestCm2: 1e-39, highestCm2: 1e-38 }] },
    });
    expect(new Set(all.map((e) => e.name))).toEqual(new Set(plain.map((e) => e.name)));
    expect(all[1].text).toBe(name.replace(/(?![\n\t])[\p{Cc}\p{Cs}\ufffe]/gu, '\ufffd').replace(/[\n\t\u2028]/g, ' '));
  });

  it('leaves gaps where a mass is not reached, and shows a lone point by its marker', () => {
    const gaps = points([1, 1e-38], [2, 1e-38], [3, null], [4, 1e-38], [5, null], [6, 1e-38], [7, 2e-38]);
    const all = drawn({ curves: [{ name: 'a', points: gaps }] });
    const [line] = linesOf(all, CURVE_STYLES[0].color);
    // Three pieces begin with M; that of the lone point has no length.
    expect(line.match(/M/g)).toHaveLength(3);
    expect(line.match(/L/g)).toHaveLength(2);
    // Ends of pieces are always marked: 1, 2, 4, 6, 7 MeV; and one in the legend.
    expect(markersOf(all, CURVE_STYLES[0].color)).toHaveLength(6);
  });

  it('places points by their logarithms', () => {
    const all = drawn({ curves: [{ name: 'a', points: points([1, 1e-40], [10, 1e-39], [100, 1e-38]) }] });
    const [line] = linesOf(all, CURVE_STYLES[0].color);
    const [[x0, y0], [x1, y1], [x2, y2]] = [...line.matchAll(/([\d.]+),([\d.]+)/g)].map((m) => [+m[1], +m[2]]);
    expect(x1).toBeCloseTo((x0 + x2) / 2, 1); // written to hundredths
    expect(y1).toBeCloseTo((y0 + y2) / 2, 1);
    expect(x2).toBeGreaterThan(x0);
    expect(y2).toBeLessThan(y0); // larger cross sections are higher up
  });

  it('tells eight curves apart by colour, and by dashes and markers without it', () => {
    const curves = CURVE_STYLES.map((_, i) => ({ name: `curve ${i}`, points: CURVE }));
    const all = drawn({ curves });
    for (const { color } of CURVE_STYLES) expect(linesOf(all, color)).toHaveLength(1);
    expect(new Set(CURVE_STYLES.map(({ color }) => color)).size).toBe(8);
    const inGrey = CURVE_STYLES.map(
      (s) => `${s.dashes} ${s.isMarkerFilled} ${CURVE_STYLES.findIndex((t) => t.marker === s.marker)}`,
    );
    expect(new Set(inGrey).size).toBe(8);
  });

  // WCAG 2.2, criterion 1.4.11: 3 to 1 for graphical objects.
  it.each(CURVE_STYLES.map(({ color }) => color))('draws %s in at least 3 to 1 against white', (color) => {
    const [r, g, b] = [1, 3, 5].map((i) => {
      const share = Number.parseInt(color.slice(i, i + 2), 16) / 255;
      return share <= 0.04045 ? share / 12.92 : ((share + 0.055) / 1.055) ** 2.4;
    });
    expect(1.05 / (0.2126 * r + 0.7152 * g + 0.0722 * b + 0.05)).toBeGreaterThan(3);
  });

  it('draws band and references behind the curves', () => {
    const all = drawn({
      references: [{ name: 'last accepted', points: CURVE }],
      band: { name: 'two tables', points: [{ massMev: 2, lowestCm2: 1e-39, highestCm2: 3e-39 }] },
    });
    const order = all.filter(({ name }) => name === 'path').map(({ attributes: a }) => a.stroke);
    const curve = all.findIndex(({ attributes: a }) => a.stroke === CURVE_STYLES[0].color && a.fill === 'none');
    expect(all.findIndex(({ attributes: a }) => a['fill-opacity'] === '0.16')).toBeLessThan(curve);
    expect(all.findIndex(({ attributes: a }) => a.stroke === '#99a0a8')).toBeLessThan(curve);
    expect(order).toContain('#99a0a8');
    expect(texts(all)).toEqual(expect.arrayContaining(['two tables', 'last accepted']));
  });

  it('marks the lightest mass only where the figure shows it', () => {
    const dotted = (edge: number): number =>
      drawn({ curves: [{ name: 'a', points: CURVE, lightestMassMev: edge }] }).filter(
        ({ attributes: a }) => a['stroke-dasharray'] === '1 4',
      ).length;
    expect([0.1, 0.6, 1.4, 900, 2000].map(dotted)).toEqual([0, 1, 1, 1, 0]);
  });

  it.each([
    { why: 'no reachable point', curve: points([1, null], [10, null]), text: 'No mass in this range reaches the goal' },
    { why: 'one point', curve: points([10, 3e-39]), text: '10−39' },
    { why: 'one point that is not reached', curve: points([10, null]), text: 'No mass in this range reaches the goal' },
    { why: 'fifteen decades', curve: points([0.001, 1e-30], [1e6, 1e-45]), text: '10−44' },
    { why: 'nearly all that a number holds', curve: points([1e-250, 1e250], [1e250, 1e-250]), text: '10−250' },
    { why: 'a narrow range', curve: points([3.1, 1e-39], [3.2, 1e-39]), text: '3.1' },
  ])('copes with $why', ({ curve, text }) => {
    const svg = reachFigure(figure({ curves: [{ name: 'a', points: curve }] }));
    expect(texts(everyElement(xmlTree(svg)))).toContain(text);
    expect(svg).not.toMatch(/NaN|Infinity|undefined|null/);
  });

  it('shows the cross sections asked for, and hides what lies beyond', () => {
    const all = drawn({ crossSectionRangeCm2: { from: 1e-39, to: 1e-38 } });
    expect(texts(all)).toEqual(expect.arrayContaining(['10−39', '10−38']));
    expect(texts(all)).not.toContain('10−37');
    expect(all.filter(({ name, attributes: a }) => name === 'svg' && a.overflow === 'hidden')).toHaveLength(1);
  });

  it('has the size asked for, in one shape', () => {
    const [svg] = drawn({ widthPx: 1200, heightPx: 1000 });
    expect(svg.attributes).toMatchObject({ width: '1200', height: '1000', viewBox: '0 0 480 400' });
    expect(() => reachFigure(figure({ widthPx: 1200, heightPx: 200 }))).toThrow(/heightPx.*at least \d+/);
  });

  it('shortens names that are too long to show, and has them whole in the description', () => {
    const name = 'a very long name '.repeat(20).trim();
    const all = drawn({ curves: [{ name, points: CURVE }] });
    expect(texts(all).filter((text) => text.endsWith('…') && name.startsWith(text.slice(0, -1)))).toHaveLength(1);
    expect(all[2].text).toContain(name);
  });

  it('refuses what cannot be drawn', () => {
    const many = (count: number): ReachFigure['curves'] =>
      Array.from({ length: count }, () => ({ name: 'a', points: CURVE }));
    const faults: Partial<ReachFigure>[] = [
      { curves: [] },
      { curves: many(9) },
      { references: many(REFERENCE_DASHES.length + 1) },
      { curves: [{ name: 'a', points: [] }] },
      { curves: [{ name: 'a', points: points([0, 1e-38]) }] },
      { curves: [{ name: 'a', points: points([1, 0]) }] },
      { curves: [{ name: 'a', points: points([1, Number.NaN]) }] },
      { curves: [{ name: 'a', points: points([1e-300, 1e-38]) }] },
      { curves: [{ name: 'a', points: CURVE, lightestMassMev: Infinity }] },
      { band: { name: 'b', points: [{ massMev: 1, lowestCm2: -1, highestCm2: 1 }] } },
      { crossSectionRangeCm2: { from: 1e-38, to: 1e-38 } },
      { widthPx: 0 },
    ];
    for (const fault of faults) expect(() => reachFigure(figure(fault)), JSON.stringify(fault)).toThrow(DomainError);
  });
});

describe('logTicks', () => {
  const labels = (ticks: readonly Tick[]): string[] =>
    ticks.flatMap(({ label }) =>
      label ? [label.base + (label.exponent === undefined ? '' : `^${label.exponent}`)] : [],
    );

  it.each([
    { from: 0.5, to: 1200, length: 400, expected: ['10^0', '10^1', '10^2', '10^3'] },
    {
      from: 1e-45,
      to: 1e-30,
      length: 280,
      expected: ['10^−44', '10^−42', '10^−40', '10^−38', '10^−36', '10^−34', '10^−32', '10^−30'],
    },
    { from: 2.5, to: 25, length: 400, expected: ['3', '5', '10', '20'] },
    { from: 0.0025, to: 0.02, length: 400, expected: ['0.003', '0.005', '0.01', '0.02'] },
    { from: 2.5e-6, to: 2.5e-5, length: 400, expected: ['3 · 10^−6', '5 · 10^−6', '10^−5', '2 · 10^−5'] },
    { from: 3, to: 8, length: 400, expected: ['3', '4', '5', '6', '7', '8'] },
    { from: 3.1, to: 3.9, length: 400, expected: ['3.2', '3.4', '3.6', '3.8'] },
  ])('labels $from … $to over $length units', ({ from, to, length, expected }) => {
    expect(labels(logTicks({ from, to }, length, length > 300 ? 46 : 26))).toEqual(expected);
  });

  it('divides decades into 2…9 where there is room', () => {
    const values = (length: number): number[] => logTicks({ from: 1, to: 100 }, length, 20).map(({ value }) => value);
    expect(values(100)).toEqual([1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 20, 30, 40, 50, 60, 70, 80, 90, 100]);
    expect(values(60)).toEqual([1, 10, 100]);
  });

  it('keeps labels apart over any number of decades', () => {
    let compared = 0;
    for (let decades = 2; decades <= 600; decades += 7) {
      const range = { from: 1e-300, to: Number(`1e${decades - 300}`) };
      const labelled = logTicks(range, 280, 26).filter(({ label }) => label);
      for (let i = 1; i < labelled.length; i++) {
        const units = (280 / decades) * Math.log10(labelled[i].value / labelled[i - 1].value);
        expect(units).toBeGreaterThan(26 - 1e-9);
        compared++;
      }
    }
    expect(compared).toBeGreaterThan(300);
  });
});

describe('text in a figure', () => {
  it('escapes markup and what XML forbids, and keeps everything else', () => {
    expect(escapeXml(`<a href="x">&'`)).toBe('&lt;a href=&quot;x&quot;&gt;&amp;&#39;');
    expect(escapeXml('σ̄ₑ 😀 暗黒物質')).toBe('σ̄ₑ 😀 暗黒物質');
    expect(escapeXml('a\u0007\ud83d b')).toBe('a\ufffd\ufffd b');
  });

  it('breaks and shortens to a width', () => {
    expect(wrapped('', 10, 100, 2)).toEqual([]);
    expect(wrapped('one two three', 10, 1000, 2)).toEqual(['one two three']);
    const found = wrapped('one two three four five six', 10, 70, 2);
    expect(found).toHaveLength(2);
    expect(found.join(' ')).toMatch(/^one two .*…$/);
    for (const line of found) expect(textWidth(line, 10)).toBeLessThanOrEqual(70);
    expect(shortened('暗黒物質の探索', 10, 45)).toBe('暗黒物…');
    expect(shortened('short', 10, 100)).toBe('short');
  });
});
