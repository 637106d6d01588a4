/** GET /docs in a real browser, cut off from everything but the service. */
import fs from 'node:fs';
import { chromium } from 'playwright-core';
import { afterAll, expect, test } from 'vitest';
import { type RunningService, startRunningService } from '../support/running-service.ts';

const BROWSER = '/usr/bin/chromium';
const there = fs.existsSync(BROWSER);
if (!there) console.log(`skipped: the page of GET /docs needs ${BROWSER} (apt-get install chromium)`);

let service: RunningService | undefined;
afterAll(() => service?.stop());

test.skipIf(!there)('GET /docs: shows every operation, asks no other host, without an error', async () => {
  service = await startRunningService({ WORKERS: '1' });
  const document = (await (await service.get('/openapi.json')).json()) as { paths: Record<string, object> };
  const operations = Object.values(document.paths).flatMap((item) => Object.keys(item));
  const browser = await chromium.launch({
    executablePath: BROWSER,
    args: ['--no-sandbox', '--disable-quic', '--disable-background-networking'],
  });
  try {
    const page = await browser.newPage();
    const asked: string[] = [];
    const errors: string[] = [];
    page.on('request', (request) => asked.push(request.url()));
    page.on('pageerror', (error) => errors.push(error.message));
    page.on('console', (message) => {
      if (message.type() === 'error' || message.type() === 'warning') errors.push(message.text());
    });
    await page.goto(`${service.url}/docs`, { waitUntil: 'networkidle' });
    await page.waitForSelector('.opblock');
    expect(await page.locator('.opblock').count()).toBe(operations.length);
    expect(operations.length).toBeGreaterThan(8);
    const paths = await page
      .locator('.opblock-summary-path')
      .evaluateAll((all) => all.map((one) => one.textContent ?? ''));
    expect(new Set(paths.map((text) => text.replaceAll('\u200b', '').trim()))).toEqual(
      new Set(Object.keys(document.paths)),
    );
    await page.locator('.opblock-summary').first().click();
    await page.waitForSelector('.opblock-body');
    expect(asked.length).toBeGreaterThan(3);
    expect(asked.filter((url) => !url.startsWith(`${service!.url}/`) && !url.startsWith('data:'))).toEqual([]);
    expect(errors).toEqual([]);
  } finally {
    await browser.close();
  }
});
