import { describe, expect, test } from 'vitest';
import { createVerdictTokens } from '../../../daemon/review/verdictToken.ts';
import { memoryDesk, NOW, sampleEvent, sampleRecord } from '../../support/reviewDesk.ts';
import { portOf, sendRequest } from './rawHttp.ts';
import { fillForm, postVerdict, startSampleSite, startSite } from './reviewSite.ts';

const ID = 'kr-0417-61370';

describe('a verdict', () => {
  test('is signed with name, time and the revision judged', async () => {
    const { url, desk } = await startSampleSite({ reviewers: ['duty', 'timing'] });
    const answer = await postVerdict(url, await fillForm(url));
    expect([answer.status, answer.headers.get('location')]).toEqual([303, `/events/${ID}`]);
    expect(desk.event(ID)?.verdicts).toEqual([
      { verdict: 'accept', by: 'duty', note: 'Both receivers show it.', at: NOW.toISOString(), revision: 2 },
    ]);
    const page = await (await fetch(`${url}events/${ID}`)).text();
    expect(page).toContain('Both receivers show it.');
    expect(page).toContain('value="reopen"');
    expect(page).not.toContain('value="accept"');
  });

  test('can be reopened and given anew', async () => {
    const { url, desk } = await startSampleSite();
    for (const verdict of ['reject', 'reopen', 'accept']) {
      expect((await postVerdict(url, await fillForm(url, ID, { verdict }))).status).toBe(303);
    }
    expect(desk.event(ID)?.verdicts.map(({ verdict, revision }) => [verdict, revision])).toEqual([
      ['reject', 2],
      ['reopen', 3],
      ['accept', 4],
    ]);
  });

  test.each([
    [{ by: '' }, 'give the name'],
    [{ by: 'x'.repeat(101) }, 'longer than 100'],
    [{ by: 'stranger' }, 'not among the configured reviewers'],
    [{ verdict: '' }, 'Choose a verdict'],
    [{ verdict: 'erase' }, 'Choose a verdict'],
    [{ note: '𝛿'.repeat(4001) }, '4001 characters'],
  ])('%j is 422, keeps the draft and changes nothing', async (change, words) => {
    const { url, desk } = await startSampleSite({ reviewers: ['duty'] });
    const answer = await postVerdict(url, await fillForm(url, ID, change));
    const page = await answer.text();
    expect([answer.status, desk.verdictCount()]).toEqual([422, 0]);
    expect(page).toContain(words);
    expect(page).toContain('note' in change ? change.note : 'Both receivers show it.');
  });

  test('of 4000 characters is kept whole', async () => {
    const { url, desk } = await startSampleSite();
    const note = '𝛿'.repeat(4000);
    expect((await postVerdict(url, await fillForm(url, ID, { note }))).status).toBe(303);
    expect(desk.event(ID)?.verdicts[0]?.note).toBe(note);
  });
});

describe('E2: requests from elsewhere', () => {
  const SITES: readonly (readonly [name: string, headers: Record<string, string | undefined>])[] = [
    ['no Origin', { Origin: undefined }],
    ['foreign Origin', { Origin: 'http://evil.test' }],
    ['Origin null', { Origin: 'null' }],
    ['the same host under https', { Origin: 'https://127.0.0.1' }],
    ['another port', { Origin: 'http://127.0.0.1:1' }],
    ['own Origin but cross-site by the browser', { 'Sec-Fetch-Site': 'cross-site' }],
    ['a neighbour on the same site', { Origin: undefined, 'Sec-Fetch-Site': 'same-site' }],
    ['no site at all', { Origin: undefined, 'Sec-Fetch-Site': 'none' }],
  ];

  test.each(SITES)('%s: 403, though the token is right', async (_, change) => {
    const { url, desk } = await startSampleSite();
    const body = new URLSearchParams(await fillForm(url)).toString();
    const headers: Record<string, string | undefined> = {
      Host: `127.0.0.1:${portOf(url)}`,
      Origin: url.slice(0, -1),
      'Content-Type': 'application/x-www-form-urlencoded',
      'Content-Length': String(body.length),
      ...change,
    };
    const lines = Object.entries(headers).flatMap(([name, value]) =>
      value === undefined ? [] : [`${name}: ${value}`],
    );
    const answer = await sendRequest(url, `POST /events/${ID}/verdict HTTP/1.1`, lines, body);
    expect([answer.status, desk.verdictCount()]).toEqual([403, 0]);
  });

  test('a same-origin mark of the browser is proof enough beside the token', async () => {
    const { url, desk } = await startSampleSite();
    const body = new URLSearchParams(await fillForm(url)).toString();
    const headers = [
      `Host: 127.0.0.1:${portOf(url)}`,
      'Sec-Fetch-Site: same-origin',
      'Content-Type: application/x-www-form-urlencoded',
      `Content-Length: ${body.length}`,
    ];
    expect((await sendRequest(url, `POST /events/${ID}/verdict HTTP/1.1`, headers, body)).status).toBe(303);
    expect(desk.verdictCount()).toBe(1);
  });

  test('a missing, wrong, foreign or outlived token is 403, and the draft is kept for another try', async () => {
    const desk = memoryDesk([sampleRecord(), sampleRecord({ id: 'other' })]);
    const { url } = await startSite({ desk });
    const restarted = await startSite({ desk });
    const good = await fillForm(url);
    const tokens = [
      '',
      'x',
      good.token.replace(/^./, (first) => (first === 'A' ? 'B' : 'A')),
      (await fillForm(url, 'other')).token,
      (await fillForm(restarted.url)).token,
      createVerdictTokens(new Uint8Array(32)).issue(ID, 2),
    ];
    for (const token of tokens) {
      const answer = await postVerdict(url, { ...good, token });
      expect(answer.status).toBe(403);
      expect(await answer.text()).toContain('Both receivers show it.');
    }
    expect((await postVerdict(url, { ...good, revision: '3' })).status).toBe(403);
    expect(desk.verdictCount()).toBe(0);
    expect((await postVerdict(url, good)).status).toBe(303);
  });

  test('GET and HEAD change nothing, whatever they carry', async () => {
    const { url, desk } = await startSampleSite();
    const query = new URLSearchParams(await fillForm(url)).toString();
    for (const method of ['GET', 'HEAD']) {
      expect((await fetch(`${url}events/${ID}/verdict?${query}`, { method })).status).toBe(404);
    }
    expect(desk.verdictCount()).toBe(0);
  });
});

describe('E11: two reviewers', () => {
  test('one verdict stands; the other sees both views and keeps the draft', async () => {
    const { url, desk } = await startSampleSite();
    const [first, second] = [
      await fillForm(url),
      await fillForm(url, ID, { verdict: 'reject', by: 'timing', note: 'Only one band.' }),
    ];
    expect((await postVerdict(url, first)).status).toBe(303);
    const answer = await postVerdict(url, second);
    const page = await answer.text();
    expect([answer.status, desk.verdictCount()]).toEqual([409, 1]);
    expect(page).toContain('What you judged, revision 2');
    expect(page).toContain('What stands now, revision 3');
    expect(page).toMatch(/accepted<\/strong> by <bdi>duty/);
    expect(page).toContain('Only one band.');
    // Signing again from that page goes to the new revision.
    const token = /name="token" value="([^"]*)"/.exec(page)?.[1] ?? '';
    expect((await postVerdict(url, { ...second, token, revision: '3' })).status).toBe(303);
    expect(desk.event(ID)?.event.state).toBe('rejected');
  });

  test('posts at the same moment leave one verdict', async () => {
    const { url, desk } = await startSampleSite();
    const form = await fillForm(url);
    const answers = await Promise.all(
      Array.from({ length: 12 }, (_, i) => postVerdict(url, { ...form, by: `reviewer ${i}` })),
    );
    const statuses = answers.map(({ status }) => status).sort();
    expect(statuses).toEqual([303, ...Array.from({ length: 11 }, () => 409)]);
    expect(desk.verdictCount()).toBe(1);
  });

  test('a double click is one verdict', async () => {
    const { url, desk } = await startSampleSite();
    const form = await fillForm(url);
    const answers = await Promise.all([postVerdict(url, form), postVerdict(url, form)]);
    expect(answers.map(({ status }) => status)).toEqual([303, 303]);
    expect((await postVerdict(url, form)).status).toBe(303);
    expect(desk.verdictCount()).toBe(1);
  });

  test('new arrivals between reading and signing are a conflict too', async () => {
    const { url, desk } = await startSampleSite();
    const form = await fillForm(url);
    const before = sampleRecord();
    const event = sampleEvent({ state: 'withdrawn', arrivalsUsed: 150 });
    const at = '2026-12-01T04:10:00.000Z';
    const history = [...before.history, { revision: 3, at, what: 'withdrawn', event }];
    desk.put({ ...before, event, revision: 3, changedAt: at, history });
    const answer = await postVerdict(url, form);
    expect([answer.status, desk.verdictCount()]).toEqual([409, 0]);
    expect(await answer.text()).toContain('withdrawn');
  });
});
