import { join } from 'node:path';
import type { BrowserContextOptions } from 'playwright-core';
import { describe, expect, test } from 'vitest';
import { hostileRecord, hostileTexts, PAYLOADS } from '../daemon/review/hostileTexts.ts';
import { startSampleSite, startSite } from '../daemon/review/reviewSite.ts';
import { hasBrowser } from '../support/browser.ts';
import { browserPages, DESK } from '../support/browserPages.ts';
import { auditPage } from '../support/pageAudit.ts';
import { memoryDesk, oneEvening, sampleEvent, sampleRecord } from '../support/reviewDesk.ts';

// The page in a real browser. Set REVIEW_PICTURES to a folder to have pictures taken of it.

const PICTURES = process.env['REVIEW_PICTURES'];
const ID = 'kr-0417-61370';
const PHONE = { width: 390, height: 844 };
/** A4 at 96 pixels an inch. */
const PAPER = { width: 794, height: 1123 };

describe.skipIf(!hasBrowser())('the review page in a browser', () => {
  const { open: openPage, complaints, hosts: requested } = browserPages();

  test('a candidate is accepted by keyboard alone, with a note', async () => {
    const { url, desk } = await startSite({ desk: oneEvening(), reviewers: ['duty', 'timing'] });
    const page = await openPage();
    await page.goto(url);
    await page.keyboard.press('j');
    await page.keyboard.press('j');
    await page.keyboard.press('k');
    expect(await page.evaluate('document.activeElement.textContent')).toContain('KR 0417+31');
    await page.keyboard.press('Enter');
    await page.waitForURL(`${url}events/${ID}`);

    const focusOn = async (name: string) => {
      for (let i = 0; i < 40; i++) {
        await page.keyboard.press('Tab');
        if ((await page.evaluate('document.activeElement.name ?? document.activeElement.type')) === name) return;
      }
      throw new Error(`${name} cannot be reached by Tab`);
    };
    await focusOn('verdict');
    await page.keyboard.press('Space');
    await focusOn('by');
    await page.keyboard.type('timing');
    await focusOn('note');
    await page.keyboard.type('Both receivers show it; j and k are letters here.');
    await page.keyboard.press('Tab');
    await page.keyboard.press('Enter');
    await page.getByText('accepted by a reviewer').first().waitFor();

    expect(page.url()).toBe(`${url}events/${ID}`);
    expect(desk.event(ID)?.verdicts.map(({ verdict, by, note }) => [verdict, by, note])).toEqual([
      ['accept', 'timing', 'Both receivers show it; j and k are letters here.'],
    ]);
    expect(complaints).toEqual([]);
    expect([...requested]).toEqual([new URL(url).host]);
  });

  test('nothing is sent without a verdict and a name', async () => {
    const { url, desk } = await startSite({ desk: oneEvening() });
    const page = await openPage();
    await page.goto(`${url}events/${ID}`);
    await page.locator('input[name=by]').press('Enter');
    await page.locator('button[type=submit]').click();
    expect([page.url(), desk.verdictCount()]).toEqual([`${url}events/${ID}`, 0]);
  });

  test('works without script', async () => {
    const { url, desk } = await startSite({ desk: oneEvening() });
    const page = await openPage({ viewport: DESK, javaScriptEnabled: false });
    await page.goto(url);
    await page.getByRole('link', { name: 'KR 0417+31' }).click();
    await page.getByRole('radio', { name: /Reject/ }).check();
    await page.getByLabel('Signed by').fill('duty');
    await page.getByLabel(/Note/).fill('The backend was swapped.');
    await page.getByRole('button', { name: 'Sign the verdict' }).click();
    await page.getByText('rejected by a reviewer').first().waitFor();
    expect(desk.event(ID)?.event.state).toBe('rejected');
  });

  test('hostile texts run nothing', async () => {
    const text = PAYLOADS.join(' ');
    const { url } = await startSite({ desk: memoryDesk([hostileRecord(text)], hostileTexts(text)), observatory: text });
    const page = await openPage();
    for (const path of ['', 'pulsars', 'feeds', 'mail', `events/${ID}`]) {
      await page.goto(url + path);
      expect(await page.evaluate('globalThis.hit')).toBeUndefined();
      const strangers = 'document.querySelectorAll("img, iframe, base, script:not([src^=\\"/assets/\\"])").length';
      expect([path, await page.evaluate(strangers)]).toEqual([path, 0]);
    }
    expect(complaints).toEqual([]);
    expect([...requested]).toEqual([new URL(url).host]);
  });

  test('is framed by nobody', async () => {
    const { url } = await startSampleSite();
    const page = await openPage();
    const refused = page.waitForEvent('console', (message) => message.text().includes('frame-ancestors'));
    await page.setContent(`<iframe src="${url}"></iframe>`);
    await refused;
    expect(await page.frames()[1]?.content()).not.toContain('Kestrel Ridge');
  });

  const ALL = ['', `events/${ID}`, 'events/judged', 'pulsars', 'feeds', 'mail', 'health'];
  const MAIN = ALL.slice(0, 2);
  const LOOKS: readonly (readonly [name: string, paths: string[], options: BrowserContextOptions])[] = [
    ['light', ALL, { viewport: DESK, colorScheme: 'light' }],
    ['dark', ALL, { viewport: DESK, colorScheme: 'dark' }],
    ['phone', ALL, { viewport: PHONE, colorScheme: 'light' }],
    ['print', MAIN, { viewport: PAPER, colorScheme: 'light' }],
  ];

  test.each(LOOKS)('fits the width and can be used by everybody: %s', async (name, paths, options) => {
    const desk = oneEvening();
    const event = sampleEvent({ id: 'judged', pulsar: 'KR 0052-71', state: 'rejected' });
    const verdict = {
      verdict: 'reject',
      by: 'duty',
      note: 'A long word: '.concat('x'.repeat(300)),
      at: '2026-12-01T04:00:00Z',
      revision: 2,
    } as const;
    desk.put({ ...sampleRecord(), event, verdicts: [verdict] });
    const { url } = await startSite({ desk, reviewers: ['duty', 'timing'] });
    const page = await openPage(options);
    await page.emulateMedia({ media: name === 'print' ? 'print' : 'screen' });
    for (const path of paths) {
      await page.goto(url + path);
      if (PICTURES !== undefined) {
        const picture = `${name}-${path.replace('/', '-') || 'tonight'}.png`;
        await page.screenshot({ path: join(PICTURES, picture), fullPage: true });
      }
      const tooWide = 'document.documentElement.scrollWidth - document.documentElement.clientWidth';
      expect([path, await page.evaluate(tooWide)]).toEqual([path, 0]);
      if (name !== 'print') expect([path, await auditPage(page)]).toEqual([path, []]);
    }
    expect(complaints).toEqual([]);
  });
});
