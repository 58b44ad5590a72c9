/**
 * Sorts and filters a list on the spot. The server does the same from the address, which is kept in step, so that a list without
 * scripts, reloaded or handed on as a link, is the same list.
 */
export const LIST_SCRIPT = `
  const listOf = (root) => {
    const table = root.querySelector('table[data-list]');
    const form = root.querySelector('form.filter');
    if (table === null || form === null) return;
    const rows = () => [...table.tBodies[0].rows];
    const count = document.getElementById('shown');
    const address = new URL(location.href);
    const keep = (changes) => {
      for (const [name, value] of Object.entries(changes)) {
        if (value === '') address.searchParams.delete(name);
        else address.searchParams.set(name, value);
      }
      history.replaceState(null, '', address);
    };
    const filter = () => {
      const text = form.elements.namedItem('text').value.trim().toLowerCase();
      const state = form.elements.namedItem('state').value;
      let shown = 0;
      for (const row of rows()) {
        row.hidden = !row.dataset.text.includes(text) || (state !== '' && row.dataset.state !== state);
        if (!row.hidden) shown += 1;
      }
      if (count !== null) count.textContent = shown + ' of ' + rows().length + ' shown';
    };
    form.addEventListener('input', () => {
      filter();
      keep({ text: form.elements.namedItem('text').value.trim(), state: form.elements.namedItem('state').value });
    });
    form.addEventListener('submit', (submit) => submit.preventDefault());
    for (const link of table.querySelectorAll('th a[data-by]')) {
      link.addEventListener('click', (click) => {
        click.preventDefault();
        const head = link.closest('th');
        const order = head.getAttribute('aria-sort') === 'ascending' ? 'descending' : 'ascending';
        const sign = order === 'ascending' ? 1 : -1;
        const at = head.cellIndex;
        const value = (row) => row.cells[at].dataset.sort;
        const isNumber = head.classList.contains('number');
        const compare = (a, b) => (isNumber ? Number(a) - Number(b) : a < b ? -1 : a > b ? 1 : 0);
        const known = rows().filter((row) => value(row) !== '');
        const unknown = rows().filter((row) => value(row) === '');
        known.sort((a, b) => sign * compare(value(a), value(b)));
        table.tBodies[0].append(...known, ...unknown);
        for (const other of table.querySelectorAll('th[aria-sort]')) other.removeAttribute('aria-sort');
        head.setAttribute('aria-sort', order);
        keep({ sort: link.dataset.by, order: order === 'descending' ? 'descending' : '' });
      });
    }
  };
  listOf(document);
  arrivals.push(listOf);
`;
