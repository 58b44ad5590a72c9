/**
 * The page renews itself. The server tells over an event stream that something changed (WHATWG HTML, “Server-sent events”); the
 * page is then fetched anew, and those of its parts that differ take the place of the old ones. A verdict that is being
 * written is never touched. Where no stream comes through, the version is asked for every 20 s. If the daemon stops
 * answering, the page says since when, so that a dead page never looks like a quiet night.
 */
export const LIVE_SCRIPT = `
  const POLL_MS = 20000;
  const body = document.body;
  const bar = document.getElementById('live');
  /** Part → as the server wrote it, before any script changed it. */
  const written = new Map();
  /** Called with every part that is new on the page. */
  const arrivals = [];
  const partsOf = (root) => [...root.querySelectorAll('[data-fresh]')];
  for (const part of partsOf(document)) written.set(part.dataset.fresh, part.outerHTML);

  const clock = (date) => date.toISOString().slice(11, 16) + ' UTC';
  const say = (text, kind, link) => {
    if (bar === null || bar.dataset.text === text) return;
    bar.dataset.text = text;
    bar.dataset.kind = kind;
    bar.textContent = text;
    if (link === undefined) return;
    const anchor = document.createElement('a');
    anchor.href = link.href;
    anchor.textContent = link.text;
    bar.append(' ', anchor);
  };
  const loadAgain = () => ({ href: location.pathname + location.search, text: 'Load it again' });

  const isBeingWritten = (part) => {
    const form = part.matches('form.verdict') ? part : part.querySelector('form.verdict');
    if (form === null) return false;
    return [...form.elements].some((field) => {
      if (field.type === 'radio') return field.checked !== field.defaultChecked;
      if (field.tagName === 'SELECT') return [...field.options].some((o) => o.selected !== o.defaultSelected && o.value !== '');
      return ['text', 'textarea'].includes(field.type) && field.value !== field.defaultValue;
    });
  };

  /** XMLHttpRequest parses a page without running anything in it. */
  const fetchPage = () =>
    new Promise((resolve, reject) => {
      const request = new XMLHttpRequest();
      request.open('GET', location.pathname + location.search);
      request.responseType = 'document';
      request.timeout = POLL_MS / 2;
      request.onload = () => {
        const same = new URL(request.responseURL).pathname === location.pathname;
        if (request.status === 200 && request.response !== null && same) resolve(request.response);
        else reject(new Error(same ? 'status ' + request.status : 'moved'));
      };
      request.onerror = request.ontimeout = () => reject(new Error('no answer'));
      request.send();
    });

  const replacePart = (part, next) => {
    const held = part.contains(document.activeElement) ? document.activeElement : null;
    const key = held === null ? null : held.id ? '#' + CSS.escape(held.id) : held.getAttribute('href') ? 'a[href="' + CSS.escape(held.getAttribute('href')) + '"]' : null;
    const fresh = document.adoptNode(next);
    part.replaceWith(fresh);
    for (const arrive of arrivals) arrive(fresh);
    if (key !== null) (fresh.matches(key) ? fresh : fresh.querySelector(key))?.focus({ preventScroll: true });
  };

  const eventsShown = () => new Map([...document.querySelectorAll('a.event')].map((a) => [a.getAttribute('href'), a.dataset.says ?? a.textContent]));

  let renewing = false;
  let again = false;
  const renew = async (changed) => {
    if (renewing) {
      again = true;
      return;
    }
    renewing = true;
    try {
      const before = eventsShown();
      const page = await fetchPage();
      body.dataset.version = page.body.dataset.version;
      document.title = page.title;
      let kept = false;
      for (const part of partsOf(document)) {
        const name = part.dataset.fresh;
        const next = page.querySelector('[data-fresh="' + CSS.escape(name) + '"]');
        if (next === null || next.outerHTML === written.get(name)) continue;
        if (isBeingWritten(part)) {
          const revision = (root) => root.querySelector('input[name=revision]')?.value;
          kept ||= revision(part) !== revision(next);
          continue;
        }
        written.set(name, next.outerHTML);
        replacePart(part, next);
      }
      const fresh = [...eventsShown()].filter(([href]) => !before.has(href)).map(([, says]) => says);
      if (kept) say('This event changed while you write. Your note is kept; signing shows both views.', 'changed', loadAgain());
      else if (fresh.length > 0) say('New: ' + fresh.join('; ') + '.', 'changed');
      else say('Brought up to date at ' + clock(new Date()) + (changed.length > 0 ? ': ' + changed.join(', ') : '') + '.', 'quiet');
    } catch (trouble) {
      if (trouble.message === 'moved') say('This page has moved, or you are not logged in any more.', 'lost', loadAgain());
      else await look();
    } finally {
      renewing = false;
      if (again) {
        again = false;
        void renew([]);
      }
    }
  };

  let lastAnswer = new Date();
  const heard = (news) => {
    lastAnswer = new Date();
    if (bar?.dataset.kind === 'lost') say('The watch answers again.', 'quiet');
    if (news.version !== undefined && news.version !== body.dataset.version) void renew(news.changed ?? []);
  };
  const look = async () => {
    try {
      const answer = await fetch('/api/version', { cache: 'no-store', signal: AbortSignal.timeout(POLL_MS / 2) });
      if (answer.status === 401) return say('You are not logged in any more.', 'lost', { href: '/login?next=' + encodeURIComponent(location.pathname), text: 'Log in' });
      if (!answer.ok) throw new Error('status ' + answer.status);
      heard(await answer.json());
    } catch {
      say('The watch has not answered since ' + clock(lastAnswer) + '. This page may be out of date.', 'lost');
    }
  };
  if (body.dataset.live === 'yes') {
    const stream = new EventSource('/api/changes');
    stream.addEventListener('version', (message) => heard(JSON.parse(message.data)));
    setInterval(() => {
      const silent = Date.now() - lastAnswer.getTime() > POLL_MS - 1000;
      if (silent && document.visibilityState === 'visible') void look();
    }, POLL_MS);
    document.addEventListener('visibilitychange', () => {
      if (document.visibilityState === 'visible') void look();
    });
    addEventListener('pagehide', () => stream.close());
    addEventListener('pageshow', (shown) => {
      if (shown.persisted) location.reload();
    });
  }
`;
