import { describe, expect, test } from 'vitest';
import { startSite } from '../daemon/review/reviewSite.ts';
import { hasBrowser } from '../support/browser.ts';
import { browserPages, DESK } from '../support/browserPages.ts';
import { auditPage } from '../support/pageAudit.ts';
import { memoryDesk, oneEvening, samplePulsar } from '../support/reviewDesk.ts';

// What scripts add to plots, lists and light, in a real browser.

const ID = 'kr-0417-61370';

describe.skipIf(!hasBrowser())('plots, lists and light', () => {
  const { open: openPage, complaints } = browserPages();

  test('a plot is read by keys: values in words, zoom, pan and all again', async () => {
    const { url } = await startSite({ desk: oneEvening() });
    const page = await openPage();
    await page.goto(`${url}events/${ID}`);
    const plot = page.locator('#chart-deviation');
    const readout = page.locator('figure', { has: plot }).locator('output');
    const labels = () => page.locator('#chart-frequency .date').allTextContents();
    await plot.focus();
    await page.keyboard.press('ArrowDown');
    const first = await readout.textContent();
    expect(first).toMatch(/^MJD \d+.*: .* ± .* turns \(.* ± .* [mµn]?s\)/);
    await page.keyboard.press('ArrowDown');
    expect(await readout.textContent()).not.toBe(first);

    const whole = await labels();
    for (const key of ['+', '+', '+']) await page.keyboard.press(key);
    const zoomed = await labels();
    expect(zoomed).not.toEqual(whole);
    await page.keyboard.press('ArrowRight');
    expect(await labels()).not.toEqual(zoomed);
    await page.keyboard.press('0');
    expect(await labels()).toEqual(whole);

    await plot.hover();
    for (let i = 0; i < 8; i++) await page.mouse.wheel(0, -100);
    await expect.poll(labels).not.toEqual(whole);
    await page.getByRole('button', { name: 'Show all' }).click();
    expect(await labels()).toEqual(whole);
    const mark = page.locator('#chart-deviation .point').nth(30);
    await mark.hover({ force: true });
    expect(await readout.textContent()).toContain('turns');
    expect(complaints).toEqual([]);
  });

  test('pulsars are sorted and filtered, with scripts and without', async () => {
    const names = ['KR 0417+31', 'KR 1118+62', 'KR 2210-05', 'KR 0052-71'];
    const pulsars = names.map((pulsar, i) =>
      samplePulsar({
        pulsar,
        deltaNuOverNu90: i === 2 ? null : 1e-9 * (3 - i) ** 2,
        state: i === 3 ? 'count open' : 'watched',
      }),
    );
    const { url } = await startSite({ desk: { ...memoryDesk(), pulsars: () => pulsars } });
    for (const javaScriptEnabled of [true, false]) {
      const page = await openPage({ viewport: DESK, javaScriptEnabled });
      const shown = () => page.locator('tbody tr:visible td:first-child').allTextContents();
      await page.goto(`${url}pulsars`);
      expect((await shown())[0]).toBe('KR 0052-71');
      await page.getByRole('link', { name: 'Smallest Δν/ν' }).click();
      await page.locator('th[aria-sort=ascending]', { hasText: 'Smallest' }).waitFor();
      expect(await shown()).toEqual(['KR 0052-71', 'KR 1118+62', 'KR 0417+31', 'KR 2210-05']);
      await page.getByLabel('State', { exact: true }).selectOption('count open');
      if (!javaScriptEnabled) await page.getByRole('button', { name: 'Show' }).click();
      expect(await shown()).toEqual(['KR 0052-71']);
      expect(await page.textContent('#shown')).toBe('1 of 4 shown');
      await page.reload();
      expect(await shown()).toEqual(['KR 0052-71']);
    }
    expect(complaints).toEqual([]);
  });

  test('the light is chosen and kept; the keys are explained', async () => {
    const { url } = await startSite({ desk: oneEvening() });
    const page = await openPage({ viewport: DESK, colorScheme: 'light' });
    await page.goto(url);
    const paper = () => page.evaluate('getComputedStyle(document.body).backgroundColor');
    const day = await paper();
    await page.getByRole('button', { name: 'Light: system' }).click();
    await page.getByRole('button', { name: 'Light: day' }).click();
    const night = await paper();
    expect(night).not.toBe(day);
    await page.goto(`${url}mail`);
    expect(await paper()).toBe(night);
    await page.keyboard.press('?');
    await page.getByRole('dialog', { name: 'Keys' }).waitFor();
    await page.keyboard.press('Escape');
    await page.keyboard.press('2');
    await page.waitForURL(`${url}pulsars`);
    expect(complaints).toEqual([]);
  });

  test('the audit finds what is planted', async () => {
    const page = await openPage();
    await page.setContent(`<body style="background: #fff"><h1>a</h1><h3>b</h3><p id="x" style="color: #999">pale</p>
      <p id="x">twice</p><button style="outline: none"></button><label>alone</label></body>`);
    const found = (await auditPage(page)).join('\n');
    for (const wrong of ['no language', 'not one main', 'heading 3 after 1', 'id twice: x', 'no name', 'contrast 2.85'])
      expect(found).toContain(wrong);
    expect(found).toContain('focus is not shown');
    expect(found).toContain('a label of nothing');
  });
});
