/**
 * The page's only script; everything works without it. It asks every 20 s whether anything changed. A list reloads
 * itself; a page with a form only says so, because a half-written note must not vanish. If the daemon stops
 * answering, the page says since when, so that a dead page never looks like a quiet night.
 * The keys j and k walk through the events of a list.
 */
export const SCRIPT = `'use strict';
(() => {
  const POLL_MS = 20000;
  const body = document.body;
  const bar = document.getElementById('live');
  const form = document.querySelector('form');
  let lastAnswer = new Date();

  const clock = (date) => date.toISOString().slice(11, 16) + ' UTC';
  const say = (text, kind, withLink) => {
    if (bar.dataset.text === text) return;
    bar.dataset.text = text;
    bar.dataset.kind = kind;
    bar.textContent = text;
    if (!withLink) return;
    const link = document.createElement('a');
    link.href = location.pathname;
    link.textContent = 'Load it again';
    bar.append(' ', link);
  };

  const look = async () => {
    if (document.visibilityState === 'hidden') return;
    try {
      const answer = await fetch('/api/version', { cache: 'no-store', signal: AbortSignal.timeout(POLL_MS / 2) });
      if (!answer.ok) throw new Error('status ' + answer.status);
      const { version } = await answer.json();
      lastAnswer = new Date();
      if (version === body.dataset.version) say('', 'quiet', false);
      else if (form === null) location.reload();
      else say('Something changed since this page was loaded.', 'changed', true);
    } catch {
      say('The watch has not answered since ' + clock(lastAnswer) + '. This page may be out of date.', 'lost', false);
    }
  };
  if (body.dataset.live === 'yes') {
    setInterval(look, POLL_MS);
    document.addEventListener('visibilitychange', look);
  }

  const step = (direction) => {
    const links = [...document.querySelectorAll('a.event')];
    if (links.length === 0) return;
    const at = links.indexOf(document.activeElement);
    const next = at < 0 ? (direction > 0 ? 0 : links.length - 1) : Math.min(links.length - 1, Math.max(0, at + direction));
    links[next].focus();
  };
  document.addEventListener('keydown', (key) => {
    if (key.ctrlKey || key.altKey || key.metaKey || key.target.closest('input, textarea, select')) return;
    if (key.key === 'j') step(1);
    if (key.key === 'k') step(-1);
  });

  // One signature a form, however often the button is pressed.
  if (form !== null) {
    let sent = false;
    form.addEventListener('submit', (submit) => {
      if (sent) submit.preventDefault();
      sent = true;
    });
    addEventListener('pageshow', () => {
      sent = false;
    });
  }
})();
`;
