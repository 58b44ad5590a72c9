import { describe, expect, test } from 'vitest';
import { startSite } from '../daemon/review/reviewSite.ts';
import { hasBrowser } from '../support/browser.ts';
import { browserPages } from '../support/browserPages.ts';
import { memoryDesk, oneEvening, sampleRecord } from '../support/reviewDesk.ts';

// What happens on an open page while the watch goes on, in a real browser.

const ID = 'kr-0417-61370';

describe.skipIf(!hasBrowser())('an open page', () => {
  const { open: openPage, complaints, hosts: requested } = browserPages();

  test('a new event appears by itself, is opened, judged by keyboard, and exported', async () => {
    const desk = memoryDesk([]);
    const { url } = await startSite({ desk });
    const page = await openPage();
    await page.goto(url);
    expect(await page.textContent('h1')).toContain('Quiet');
    desk.put(sampleRecord());
    await page.locator('main a.event').waitFor();
    expect(await page.textContent('h1')).toContain('1 candidate waits');
    await page.getByText('New: KR 0417+31, candidate glitch.').waitFor();

    await page.keyboard.press('j');
    await page.keyboard.press('Enter');
    await page.waitForURL(`${url}events/${ID}`);
    await page.keyboard.press('r');
    expect(await page.evaluate('document.activeElement.id')).toBe('note');
    await page.keyboard.type('a and r are letters here');
    await page.keyboard.press('Escape');
    await page.keyboard.press('a');
    expect(await page.locator('input[value=accept]').isChecked()).toBe(true);
    await page.keyboard.press('Shift+Tab');
    await page.keyboard.type('duty');
    await page.keyboard.press('Enter');
    await page.getByText('accepted by a reviewer').first().waitFor();
    expect(desk.event(ID)?.verdicts.map(({ verdict, by, note }) => [verdict, by, note])).toEqual([
      ['accept', 'duty', 'a and r are letters here'],
    ]);

    for (const [name, file] of [
      ['VOEvent', 'notice.xml'],
      ['JSON', 'event.json'],
      ['CSV', 'event.csv'],
    ] as const) {
      const [download] = await Promise.all([
        page.waitForEvent('download'),
        page.getByRole('link', { name, exact: true }).click(),
      ]);
      expect(download.suggestedFilename()).toBe(file);
    }
    expect(complaints).toEqual([]);
    expect([...requested]).toEqual([new URL(url).host]);
  });

  test('a note that is being written survives a change of its event, and two reviewers lose no verdict', async () => {
    const desk = oneEvening();
    const { url } = await startSite({ desk });
    const [one, other] = [await openPage(), await openPage()];
    await one.goto(`${url}events/${ID}`);
    await other.goto(`${url}events/${ID}`);
    await one.getByLabel(/Note/).fill('half a tho');
    await other.keyboard.press('r');
    await other.keyboard.type('The backend was swapped.');
    await other.getByLabel('Signed by').fill('timing');
    await other.getByRole('button', { name: 'Sign the verdict' }).click();
    await other.getByText('rejected by a reviewer').first().waitFor();

    await one.getByText('This event changed while you write.').waitFor();
    await one.getByText('The backend was swapped.').waitFor();
    await one.getByLabel(/Note/).pressSequentially('ught');
    await one.getByRole('radio', { name: /Accept/ }).check();
    await one.getByLabel('Signed by').fill('duty');
    const [answer] = await Promise.all([
      one.waitForResponse((response) => response.request().method() === 'POST'),
      one.getByRole('button', { name: 'Sign the verdict' }).click(),
    ]);
    expect(answer.status()).toBe(409);
    await one.getByText('What you judged, revision 2').waitFor();
    expect(await one.getByLabel(/Note/).inputValue()).toBe('half a thought');
    expect(desk.event(ID)?.verdicts.map(({ by }) => by)).toEqual(['timing']);
    expect(complaints.filter((text) => !text.includes('409'))).toEqual([]);
  });

  test('a note survives a reload; an untouched page follows its event', async () => {
    const desk = oneEvening();
    const { url } = await startSite({ desk });
    const page = await openPage();
    await page.goto(`${url}events/${ID}`);
    const record = desk.event(ID)!;
    desk.put({ ...record, revision: 3, event: { ...record.event, arrivalsUsed: 977 } });
    await page.getByText('from 977 arrivals').waitFor();
    expect(await page.locator('input[name=revision]').inputValue()).toBe('3');
    await page.getByLabel(/Note/).fill('kept');
    await page.reload();
    expect(await page.getByLabel(/Note/).inputValue()).toBe('kept');
  });

  test('without a stream the page asks by itself, and a dead daemon is noticed', async () => {
    const desk = oneEvening();
    const { url } = await startSite({ desk });
    const list = await openPage();
    await list.route('**/api/changes', (route) => route.fulfill({ status: 503, body: '' }));
    await list.clock.install();
    await list.goto(url);
    desk.put(sampleRecord({ id: 'new', pulsar: 'KR 0052-71' }));
    await list.clock.runFor(45_000);
    await list.getByText('KR 0052-71').first().waitFor();
    await list.route('**/api/version', (route) => route.abort());
    await list.clock.runFor(45_000);
    await list.getByText('The watch has not answered since').waitFor();
  });
});
