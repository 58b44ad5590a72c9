import { describe, expect, test } from 'vitest';
import { createChanges, type News } from '../../../daemon/review/changes.ts';
import { memoryDesk, sampleRecord } from '../../support/reviewDesk.ts';
import { startSite } from './reviewSite.ts';

const FAST = { lookEveryMs: 5 };

/** The news of a stream, one by one. */
async function* newsOf(stream: ReadableStream<Uint8Array>): AsyncGenerator<News> {
  const decoder = new TextDecoder();
  let text = '';
  for await (const chunk of stream as unknown as AsyncIterable<Uint8Array>) {
    text += decoder.decode(chunk, { stream: true });
    for (let cut = text.indexOf('\n\n'); cut >= 0; cut = text.indexOf('\n\n')) {
      const data = /^data: (.*)$/m.exec(text.slice(0, cut))?.[1];
      text = text.slice(cut + 2);
      if (data !== undefined) yield JSON.parse(data);
    }
  }
}

describe('news to open pages', () => {
  test('begin with the version and go on with what changed', async () => {
    const desk = memoryDesk();
    const news = newsOf(createChanges(desk, FAST).stream()!);
    expect((await news.next()).value).toEqual({ version: desk.version(), changed: [] });
    desk.put(sampleRecord({ id: 'new' }));
    expect((await news.next()).value).toEqual({ version: desk.version(), changed: ['events'] });
    await news.return(undefined);
  });

  test('ask the desk once for all, and not at all when nobody looks', async () => {
    const desk = memoryDesk();
    let asked = 0;
    const counting = {
      version: () => {
        asked += 1;
        return desk.version();
      },
      marks: desk.marks,
    };
    const changes = createChanges(counting, FAST);
    const all = [1, 2, 3].map(() => newsOf(changes.stream()!));
    await Promise.all(all.map((news) => news.next()));
    desk.put(sampleRecord({ id: 'new' }));
    const told = await Promise.all(all.map(async (news) => (await news.next()).value));
    expect(told.map(({ changed }) => changed)).toEqual([['events'], ['events'], ['events']]);
    await Promise.all(all.map((news) => news.return(undefined)));
    const before = asked;
    await new Promise((resolve) => setTimeout(resolve, 60));
    expect(asked).toBe(before);
  });

  test('are bounded in number and in time, and end when the page closes', async () => {
    const closing = new AbortController();
    const changes = createChanges(memoryDesk(), { ...FAST, mostStreams: 2, closing: closing.signal });
    const open = [changes.stream()!, changes.stream()!].map(newsOf);
    expect(changes.stream()).toBeNull();
    closing.abort();
    for (const news of open) {
      await news.next();
      expect((await news.next()).done).toBe(true);
    }
    const short = newsOf(createChanges(memoryDesk(), { ...FAST, streamMs: 30 }).stream()!);
    await short.next();
    expect((await short.next()).done).toBe(true);
  });

  test('come over HTTP, and a HEAD opens no stream', async () => {
    const { url, desk } = await startSite({ desk: memoryDesk() });
    const answer = await fetch(`${url}api/changes`);
    expect(answer.headers.get('content-type')).toBe('text/event-stream');
    const news = newsOf(answer.body!);
    expect((await news.next()).value.version).toBe(desk.version());
    desk.put(sampleRecord({ id: 'new' }));
    expect((await news.next()).value.changed).toEqual(['events']);
    await news.return(undefined);
    expect((await fetch(`${url}api/changes`, { method: 'HEAD' })).status).toBe(200);
  });
});
