import type { ChangeMarks, ReviewDesk } from './desk.ts';

/**
 * Tells open pages that something changed, as an event stream (WHATWG HTML, “Server-sent events”). The desk is asked once for
 * all of them, and only while somebody looks. Every stream ends after some minutes; the browser comes back by itself, and is
 * then asked again who it is.
 */
export interface Changes {
  /** Null: too many pages are open; the page then asks by itself. */
  stream(): ReadableStream<Uint8Array> | null;
}

export interface ChangesSettings {
  readonly lookEveryMs?: number;
  readonly streamMs?: number;
  readonly mostStreams?: number;
  /** Ends every stream. */
  readonly closing?: AbortSignal;
}

/** What a page is told; it asks for the same when no stream comes through. */
export interface News {
  readonly version: string;
  readonly changed: readonly (keyof ChangeMarks)[];
}

const LOOK_EVERY_MS = 2_000;
const STREAM_MS = 5 * 60_000;
const MOST_STREAMS = 48;
/** Shorter than the server's patience with a silent connection, and the page's with a silent server. */
const SIGN_EVERY_MS = 8_000;
const COME_BACK_MS = 2_000;

type Listener = ReadableStreamDefaultController<Uint8Array>;

export function createChanges(desk: Pick<ReviewDesk, 'version' | 'marks'>, settings: ChangesSettings = {}): Changes {
  const { lookEveryMs = LOOK_EVERY_MS, streamMs = STREAM_MS, mostStreams = MOST_STREAMS, closing } = settings;
  const listeners = new Map<Listener, NodeJS.Timeout>();
  const encoder = new TextEncoder();
  let timer: NodeJS.Timeout | null = null;
  let known = { version: '', marks: null as ChangeMarks | null };
  let silentMs = 0;

  const end = (listener: Listener) => {
    clearTimeout(listeners.get(listener));
    if (!listeners.delete(listener)) return;
    try {
      listener.close();
    } catch {
      // The visitor closed it first.
    }
    if (listeners.size === 0 && timer !== null) {
      clearInterval(timer);
      timer = null;
    }
  };
  const tell = (text: string, to: Iterable<Listener> = [...listeners.keys()]) => {
    for (const listener of to) listener.enqueue(encoder.encode(text));
  };
  const look = () => {
    const marks = desk.marks();
    const now = { version: desk.version(), marks };
    silentMs += lookEveryMs;
    if (now.version === known.version && silentMs < SIGN_EVERY_MS) return;
    const changed = known.marks === null ? [] : changedBetween(known.marks, marks);
    known = now;
    silentMs = 0;
    tell(eventText({ version: now.version, changed }));
  };
  closing?.addEventListener('abort', () => {
    for (const listener of [...listeners.keys()]) end(listener);
  });

  return {
    stream() {
      if (listeners.size >= mostStreams || closing?.aborted) return null;
      let own: Listener;
      return new ReadableStream<Uint8Array>({
        start(listener) {
          own = listener;
          if (timer === null) {
            known = { version: desk.version(), marks: desk.marks() };
            timer = setInterval(look, lookEveryMs);
            timer.unref();
          }
          const over = setTimeout(() => end(listener), streamMs);
          over.unref();
          listeners.set(listener, over);
          const first = eventText({ version: desk.version(), changed: [] });
          tell(`retry: ${COME_BACK_MS}\n\n${first}`, [listener]);
        },
        cancel: () => end(own),
      });
    },
  };
}

function eventText(news: News): string {
  return `event: version\ndata: ${JSON.stringify(news)}\n\n`;
}

function changedBetween(before: ChangeMarks, now: ChangeMarks): (keyof ChangeMarks)[] {
  return (Object.keys(now) as (keyof ChangeMarks)[]).filter((part) => now[part] !== before[part]);
}
