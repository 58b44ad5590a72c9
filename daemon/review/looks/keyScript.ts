/** Keys, the help on them, the choice of light, and one signature a form however often its button is pressed. */
export const KEY_SCRIPT = `
  const help = document.getElementById('keys');
  for (const button of document.querySelectorAll('[data-opens]')) {
    button.hidden = false;
    button.addEventListener('click', () => document.getElementById(button.dataset.opens).showModal());
  }

  const LIGHTS = { system: 'Light: system', day: 'Light: day', night: 'Light: night' };
  const light = document.getElementById('light');
  if (light !== null) {
    const show = () => {
      light.textContent = LIGHTS[document.documentElement.dataset.light ?? 'system'];
    };
    light.hidden = false;
    light.addEventListener('click', () => {
      const names = Object.keys(LIGHTS);
      const next = names[(names.indexOf(document.documentElement.dataset.light ?? 'system') + 1) % names.length];
      if (next === 'system') delete document.documentElement.dataset.light;
      else document.documentElement.dataset.light = next;
      try {
        localStorage.setItem('spinvigil.light', next);
      } catch {
        // Without storage it holds for this page.
      }
      show();
    });
    show();
  }

  /** In a list to the next event's link, on an event's page to the next event. */
  const step = (direction) => {
    const neighbour = document.querySelector(direction > 0 ? 'a[rel=next]' : 'a[rel=prev]');
    if (document.querySelector('.siblings') !== null) return neighbour?.click();
    const links = [...document.querySelectorAll('main a.event')].filter((link) => link.offsetParent !== null);
    if (links.length === 0) return;
    const at = links.indexOf(document.activeElement);
    const next = at < 0 ? (direction > 0 ? 0 : links.length - 1) : Math.min(links.length - 1, Math.max(0, at + direction));
    links[next].focus();
  };
  const choose = (verdict) => {
    const choice = document.querySelector('form.verdict input[name=verdict][value=' + verdict + ']');
    if (choice === null) return;
    choice.checked = true;
    document.getElementById('note').focus();
  };
  const goTo = (number) => document.querySelectorAll('.top nav a')[number - 1]?.click();
  const KEYS = new Map([
    ['j', () => step(1)],
    ['k', () => step(-1)],
    ['a', () => choose('accept')],
    ['r', () => choose('reject')],
    ['o', () => choose('reopen')],
    ['/', () => document.querySelector('main input[type=search]')?.focus()],
    ['?', () => help?.showModal()],
    ...[1, 2, 3, 4, 5].map((number) => [String(number), () => goTo(number)]),
  ]);
  document.addEventListener('keydown', (key) => {
    if (key.ctrlKey || key.altKey || key.metaKey || key.defaultPrevented) return;
    if (key.target.closest?.('input, textarea, select') || document.querySelector('dialog[open]') !== null) {
      if (key.key === 'Escape' && key.target.closest?.('textarea')) key.target.blur();
      return;
    }
    const act = KEYS.get(key.key);
    if (act === undefined) return;
    key.preventDefault();
    act();
  });

  // A note survives a reload of its page, in this tab alone, until it is signed.
  const keepNote = (root) => {
    const form = root.matches?.('form.verdict') ? root : root.querySelector('form.verdict');
    if (form === null) return;
    const note = form.elements.namedItem('note');
    const key = 'spinvigil.note ' + location.pathname;
    try {
      if (note.value === '') note.value = sessionStorage.getItem(key) ?? '';
      note.addEventListener('input', () => sessionStorage.setItem(key, note.value));
      form.addEventListener('submit', () => sessionStorage.removeItem(key));
    } catch {
      // Without storage the note lives as long as the page.
    }
    let sent = false;
    form.addEventListener('submit', (submit) => {
      if (sent) submit.preventDefault();
      sent = true;
    });
    addEventListener('pageshow', () => {
      sent = false;
    });
  };
  keepNote(document);
  arrivals.push(keepNote);
`;
