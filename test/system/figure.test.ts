/** Reach figures in a real browser: what the eye would object to, measured. */
import fs from 'node:fs';
import { type Browser, chromium, type Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { type FigureCurve, type ReachFigure, reachFigure } from '../../service/figure/reach-figure.ts';

const BROWSER = '/usr/bin/chromium';
const there = fs.existsSync(BROWSER);
if (!there) console.log(`skipped: reach figures need ${BROWSER} (apt-get install chromium)`);

/** Steep at a kinematic edge, flat at the bottom, rising as the mass. */
function invented(name: string, edge: number, factor: number): FigureCurve {
  const points = Array.from({ length: 40 }, (_, i) => {
    const massMev = 0.5 * 2000 ** (i / 39);
    const share = 1 - edge / massMev;
    return { massMev, crossSectionCm2: share > 0 ? (factor * 1e-40 * (1 + massMev / 50)) / share ** 4 : null };
  });
  return { name, points, lightestMassMev: edge };
}

const FIGURES: Record<string, ReachFigure> = {
  'one curve': { title: 'Silicon, 100 g yr', curves: [invented('two electrons or more', 1.403, 1)] },
  'everything at once': {
    title: 'Everything that a figure can hold, under a title that needs to be broken into two lines',
    subtitle: '90 % exclusion without background, heavy mediator, and as much more as makes two lines of it too',
    curves: Array.from({ length: 8 }, (_, i) => invented(`Curve ${i + 1} with a longer name`, 0.6 + i / 3, 3 ** i)),
    references: Array.from({ length: 4 }, (_, i) => invented(`Reference ${i + 1}`, 1, 0.3 ** i)),
    band: {
      name: 'lowest to highest of three tables',
      points: invented('', 1, 1).points.map(({ massMev, crossSectionCm2: s }) => ({
        massMev,
        lowestCm2: s && s / 2,
        highestCm2: s && s * 2,
      })),
    },
  },
  'two columns': {
    title: 'Short names',
    curves: ['A', 'B', 'C'].map((name, i) => ({ ...invented(name, 1, 2 ** i), lightestMassMev: undefined })),
  },
  'wide letters': { title: 'W'.repeat(90), subtitle: '暗黒物質'.repeat(40), curves: [invented('M'.repeat(120), 1, 1)] },
  'fifteen decades': {
    title: 'Huge',
    curves: [
      {
        name: 'a',
        points: [
          { massMev: 1e-3, crossSectionCm2: 1e-30 },
          { massMev: 1e6, crossSectionCm2: 1e-45 },
        ],
      },
    ],
  },
  'nothing reached': { title: 'Nothing', curves: [{ name: 'a', points: [{ massMev: 1, crossSectionCm2: null }] }] },
  'flat and wide': { title: 'Flat', curves: [invented('a', 1, 1)], widthPx: 900, heightPx: 600 },
};

interface Box {
  readonly x: number;
  readonly y: number;
  readonly width: number;
  readonly height: number;
}

interface ShownText {
  readonly text: string;
  readonly box: Box;
}

function isInside({ x, y, width, height }: Box, outer: Box): boolean {
  return x >= outer.x && y >= outer.y && x + width <= outer.x + outer.width && y + height <= outer.y + outer.height;
}

/** Boxes are as high as the font's tallest letters, so neighbouring lines may share a fifth of a line and not touch. */
function touch(one: Box, other: Box): boolean {
  const across = Math.min(one.x + one.width, other.x + other.width) - Math.max(one.x, other.x);
  const down = Math.min(one.y + one.height, other.y + other.height) - Math.max(one.y, other.y);
  return across > 0 && down > 0.2 * Math.min(one.height, other.height);
}

describe.skipIf(!there)('reachFigure in a browser', () => {
  let browser: Browser;
  let page: Page;
  const asked: string[] = [];
  const dialogs: string[] = [];

  beforeAll(async () => {
    browser = await chromium.launch({
      executablePath: BROWSER,
      args: ['--no-sandbox', '--disable-quic', '--disable-background-networking'],
    });
    page = await browser.newPage();
    page.on('request', (request) => asked.push(request.url()));
    page.on('dialog', (dialog) => {
      dialogs.push(dialog.message());
      void dialog.dismiss();
    });
  });
  afterAll(() => browser?.close());

  /** The texts of the figure, opened as a document of its own. A browser that finds it malformed shows an error in its place. */
  async function shown(figure: ReachFigure): Promise<{ figure: Box; texts: ShownText[] }> {
    const svg = Buffer.from(reachFigure(figure)).toString('base64');
    await page.goto(`data:image/svg+xml;base64,${svg}`);
    expect(await page.locator('parsererror').count()).toBe(0);
    const texts = await page.locator('text').all();
    return {
      figure: (await page.locator('svg').first().boundingBox())!,
      texts: await Promise.all(
        texts.map(async (text) => ({ text: (await text.textContent())!, box: (await text.boundingBox())! })),
      ),
    };
  }

  test.each(Object.keys(FIGURES))(
    '%s: is read as SVG, with every text inside the figure and none over another',
    async (name) => {
      const { figure, texts } = await shown(FIGURES[name]);
      expect(texts.length).toBeGreaterThan(5);
      expect(texts.filter(({ box }) => !isInside(box, figure)).map(({ text }) => text)).toEqual([]);
      const overlaps = texts.flatMap((one, i) => texts.slice(i + 1).filter((other) => touch(one.box, other.box)));
      expect(overlaps.map(({ text }) => text)).toEqual([]);
    },
  );

  test('hostile names: shown, not run, and nothing is asked for', async () => {
    const name = '</text><script>alert(1)</script><image href="http://invalid.invalid/" onerror="alert(2)"/>';
    const { texts } = await shown({ title: name, curves: [{ ...invented(name, 1, 1), lightestMassMev: undefined }] });
    expect(texts.filter(({ text }) => text.startsWith('</text><script>alert(1)'))).toHaveLength(2);
    expect(asked.filter((url) => !url.startsWith('data:'))).toEqual([]);
    expect(dialogs).toEqual([]);
  });

  test('an assistant finds an image with its name and its description', async () => {
    await shown(FIGURES['one curve']);
    const image = page.getByRole('img', { name: 'Silicon, 100 g yr' });
    expect(await image.count()).toBe(1);
    expect(await image.locator('desc').textContent()).toMatch(/two electrons or more: reached from .* MeV/);
  });
});
