import { beforeAll, describe, expect, test } from 'vitest';
import { planText } from '../../../alerts/wording/plan.ts';
import { DAY, NIGHT } from '../../../daemon/review/looks/style.ts';
import { memoryDesk, sampleEvent, samplePlan, sampleRecord } from '../../support/reviewDesk.ts';
import { hostileRecord, hostileTexts, PAYLOADS } from './hostileTexts.ts';
import { fillForm, postVerdict, startSampleSite, startSite } from './reviewSite.ts';

const PATHS = ['', 'pulsars', 'feeds', 'mail'];

async function pageText(url: string, path: string): Promise<string> {
  return (await fetch(url + path)).text();
}

/** Every tag with the names of its attributes: what escaping must leave alone. */
function skeleton(page: string): string[] {
  return [...page.matchAll(/<\/?([a-zA-Z][a-zA-Z0-9]*)((?:\s+[a-zA-Z-]+(?:="[^"]*")?|\s*\/)*)\s*>/g)].map(
    ([, tag, attributes = '']) =>
      `${tag} ${[...attributes.matchAll(/([a-zA-Z-]+)(?:="[^"]*")?/g)].map(([, name]) => name).join(' ')}`,
  );
}

/** What each page of a site that is full of `text` holds, and the page that hands back a refused draft. */
async function pagesFullOf(text: string): Promise<readonly (readonly [path: string, page: string])[]> {
  const { url } = await startSite({
    desk: memoryDesk([hostileRecord(text)], hostileTexts(text)),
    reviewers: [text],
    observatory: text,
  });
  const refused = await postVerdict(url, await fillForm(url, undefined, { by: `nobody ${text}`, note: text }));
  return [
    ...(await Promise.all(
      [...PATHS, 'events/kr-0417-61370'].map(async (path) => [path, await pageText(url, path)] as const),
    )),
    ['refused', await refused.text()],
  ];
}

describe('E4: script injection', () => {
  let tame: Awaited<ReturnType<typeof pagesFullOf>>;
  beforeAll(async () => {
    tame = await pagesFullOf('harmless');
  });

  test.each(PAYLOADS)('%j adds no element and no attribute', async (payload) => {
    const wild = await pagesFullOf(payload);
    for (const [i, [path, page]] of wild.entries()) {
      const good = tame[i]?.[1] ?? '';
      expect([path, skeleton(page)]).toEqual([path, skeleton(good)]);
      // Every `<` opens a tag of the skeleton, the document type, or nothing of ours.
      expect([path, page.split('<').length]).toEqual([path, good.split('<').length]);
    }
  });

  test('the skeleton sees an injected element and an injected attribute', () => {
    expect(skeleton('<p class="a">x</p>')).toEqual(['p class', 'p ']);
    expect(skeleton('<p class="a"><img src="x">x</p>')).toHaveLength(3);
    expect(skeleton('<p class="a" onclick="x">x</p>')[0]).toBe('p class onclick');
  });

  test('an event is found under any id, and its address is escaped', async () => {
    for (const id of ['a/b', 'a?b#c', '"><script>', '%41', 'ν̇ 二', '__proto__', 'KR 0417+31']) {
      const { url } = await startSite({ desk: memoryDesk([sampleRecord({ id })]) });
      expect([id, (await fetch(`${url}events/${encodeURIComponent(id)}`)).status]).toEqual([id, 200]);
      expect((await postVerdict(url, await fillForm(url, id), {}, id)).status).toBe(303);
    }
    const { url } = await startSampleSite();
    for (const id of ['__proto__', 'constructor', 'toString']) {
      expect((await fetch(`${url}events/${id}`)).status).toBe(404);
    }
  });
});

describe('pages', () => {
  test('Tonight says what waits, what is wrong, and lists by state', async () => {
    const decided = sampleRecord({ id: 'old', pulsar: 'KR 0052-71', state: 'withdrawn' });
    const records = [sampleRecord(), sampleRecord({ id: 's', pulsar: 'KR 1118+62', state: 'suspected' }), decided];
    const { url } = await startSite({ desk: memoryDesk(records, { problem: 'No file was read for 3 h.' }) });
    const page = await pageText(url, '');
    expect(page).toContain('1 candidate waits for a verdict; 3 pulsars watched.');
    expect(page).toContain('No file was read for 3 h.');
    const at = (text: string) => page.indexOf(text);
    expect(at('id="waiting"')).toBeLessThan(at('KR 0417+31</bdi>'));
    expect(at('KR 0417+31</bdi>')).toBeLessThan(at('id="suspected"'));
    expect(at('id="suspected"')).toBeLessThan(at('KR 1118+62</bdi>'));
    expect(at('id="decided"')).toBeLessThan(at('KR 0052-71</bdi>'));
    expect(page).toContain('must be vetted');
  });

  test('a quiet night says so', async () => {
    const { url } = await startSite({ desk: memoryDesk([]) });
    expect(await pageText(url, '')).toContain('Quiet: no candidate waits, nothing is suspected; 3 pulsars watched.');
  });

  test('an event is a candidate, with its caution, until it is accepted', async () => {
    const { url } = await startSampleSite();
    const before = await pageText(url, 'events/kr-0417-61370');
    expect(before).toContain('candidate glitch');
    expect(before).toContain('must be vetted by a person');
    expect(before).toContain('(17.0 ± 0.5) × 10⁻⁹');
    expect(before).toContain('<svg');
    await postVerdict(url, await fillForm(url));
    const after = await pageText(url, 'events/kr-0417-61370');
    expect(after).not.toContain('must be vetted by a person');
    expect(after).toContain('accepted by a reviewer');
  });

  test('an event says what more observations would settle, in the words of the command plan', async () => {
    const records = [sampleRecord(), sampleRecord({ id: 'other' }), sampleRecord({ id: 'over', state: 'withdrawn' })];
    const desk = memoryDesk(records);
    const plan = samplePlan(sampleEvent());
    const { url } = await startSite({ desk: { ...desk, plan: () => plan } });
    const section = async (id: string) =>
      /<section class="plan".*?<\/section>/s
        .exec(await pageText(url, `events/${id}`))?.[0]
        .replace(/&[#a-z0-9]+;/g, "'");
    const own = (await section('kr-0417-61370'))!;
    const said = planText({ ...plan, cadences: [] }, 'UTC')
      .split('\n')
      .slice(2);
    expect(said.length).toBeGreaterThan(6);
    for (const line of said) expect(own).toContain(line.trim());
    // What is planned for one event is no plan for another, and one that is over needs none.
    expect(await section('other')).toContain('Nothing is open here');
    expect(await section('over')).toBeUndefined();
  });

  test('programs get the event as JSON and CSV, and the health', async () => {
    const { url } = await startSampleSite();
    expect(await (await fetch(`${url}api/events`)).json()).toEqual([sampleEvent()]);
    expect(await (await fetch(`${url}api/events/kr-0417-61370`)).json()).toMatchObject({ event: sampleEvent() });
    expect((await fetch(`${url}api/events/none`)).status).toBe(404);
    const json = await fetch(`${url}events/kr-0417-61370/event.json`);
    expect(json.headers.get('content-disposition')).toContain('attachment');
    expect(await json.json()).toEqual(sampleEvent());
    expect(await pageText(url, 'events/kr-0417-61370/event.csv')).toContain('KR 0417+31');
    expect((await fetch(`${url}events/kr-0417-61370/notice.xml`)).headers.get('content-type')).toBe('application/xml');
    expect(await (await fetch(`${url}healthz`)).json()).toEqual({ status: 'ok', problems: [] });
    const sick = await startSite({ desk: memoryDesk([], { problem: 'mail blocked' }) });
    expect((await fetch(`${sick.url}healthz`)).status).toBe(503);
  });

  test('an id from before late data moved the event leads to it', async () => {
    const desk = memoryDesk();
    const { url } = await startSite({
      desk: { ...desk, event: (id) => desk.event(id === 'old-id' ? 'kr-0417-61370' : id) },
    });
    const answer = await fetch(`${url}events/old-id`, { redirect: 'manual' });
    expect([answer.status, answer.headers.get('location')]).toEqual([302, '/events/kr-0417-61370']);
  });
});

// WCAG 2.2, success criterion 1.4.3 and its definitions of relative luminance and contrast ratio; the two anchors are
// those of the definition: black on white is 21, equal colours 1.
describe('contrast', () => {
  const luminance = (hex: string) => {
    const [r = 0, g = 0, b = 0] = [1, 3, 5].map((at) => {
      const c = Number.parseInt(hex.slice(at, at + 2), 16) / 255;
      return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4;
    });
    return 0.2126 * r + 0.7152 * g + 0.0722 * b;
  };
  const ratio = (one: string, other: string) => {
    const [light = 0, dark = 0] = [luminance(one), luminance(other)].sort((a, b) => b - a);
    return (light + 0.05) / (dark + 0.05);
  };

  test('is measured as WCAG defines it', () => {
    expect(ratio('#000000', '#ffffff')).toBeCloseTo(21, 6);
    expect(ratio('#777777', '#777777')).toBe(1);
  });

  test.each([
    ['day', DAY],
    ['night', NIGHT],
  ])('%s: text 4.5 : 1 on every ground, marks and focus 3 : 1', (_, colours) => {
    const { ink, quiet, link, waiting, accepted, rejected, suspected, focus, before, after, fill } = colours;
    for (const ground of [colours.paper, colours.panel]) {
      for (const text of [ink, quiet, link, waiting, accepted, rejected, suspected]) {
        expect([text, ground, ratio(text, ground) >= 4.5]).toEqual([text, ground, true]);
      }
      for (const mark of [focus, before, after, fill]) {
        expect([mark, ground, ratio(mark, ground) >= 3]).toEqual([mark, ground, true]);
      }
    }
    expect(ratio(ink, colours.track)).toBeGreaterThan(4.5);
    expect(ratio(colours.panel, link)).toBeGreaterThan(4.5);
  });
});
