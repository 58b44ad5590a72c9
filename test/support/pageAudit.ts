import type { Page } from 'playwright-core';

/**
 * What of the Web Content Accessibility Guidelines 2.2 a program can check by itself: contrast (1.4.3, by its own definition of relative
 * luminance), names (4.1.2), unique ids, one order of headings (1.3.1), a language (3.1.1), the order and the visibility of the focus
 * (2.4.3, 2.4.7). Answers what is wrong, in words; an empty list is a pass.
 */
export async function auditPage(page: Page): Promise<string[]> {
  return [...((await page.evaluate(STANDING)) as string[]), ...(await walkByTab(page))];
}

const MOST_STOPS = 60;

/** Tab from the start: every stop comes later in the document than the one before, is seen, and shows that it has the focus. */
async function walkByTab(page: Page): Promise<string[]> {
  await page.evaluate('document.activeElement?.blur(); globalThis.stop = null; globalThis.stops = 0; scrollTo(0, 0)');
  const wrong: string[] = [];
  for (let i = 0; i < MOST_STOPS; i++) {
    await page.keyboard.press('Tab');
    const found = (await page.evaluate(STOP)) as { readonly end: boolean; readonly wrong: string[] };
    wrong.push(...found.wrong);
    if (found.end) break;
  }
  if ((await page.evaluate('globalThis.stops')) === 0) wrong.push('nothing can be reached by Tab');
  return wrong;
}

const STOP = `(() => {
  const at = document.activeElement;
  if (at === null || at === document.body || at === globalThis.stop) return { end: true, wrong: [] };
  const before = globalThis.stop;
  if (before !== null && before.compareDocumentPosition(at) & Node.DOCUMENT_POSITION_PRECEDING) return { end: true, wrong: [] };
  globalThis.stop = at;
  globalThis.stops += 1;
  const name = at.outerHTML.slice(0, 80);
  const wrong = [];
  const box = at.getBoundingClientRect();
  if (box.width === 0 || box.height === 0) wrong.push('focus on what is not seen: ' + name);
  const style = getComputedStyle(at);
  if (style.outlineStyle === 'none' || parseFloat(style.outlineWidth) < 1) wrong.push('focus is not shown: ' + name);
  if (at.tabIndex > 0) wrong.push('a tabindex above 0: ' + name);
  return { end: false, wrong };
})()`;

const STANDING = `(() => {
  const wrong = [];
  const short = (element) => element.outerHTML.replace(/\\s+/g, ' ').slice(0, 90);
  const seen = (element) => element.checkVisibility({ opacityProperty: true, visibilityProperty: true });

  if (!document.documentElement.lang) wrong.push('no language');
  if (!document.title) wrong.push('no title');
  if (document.querySelectorAll('main').length !== 1) wrong.push('not one main');
  const ids = [...document.querySelectorAll('[id]')].map((e) => e.id);
  for (const id of new Set(ids)) if (ids.filter((other) => other === id).length > 1) wrong.push('id twice: ' + id);

  const headings = [...document.querySelectorAll('h1, h2, h3, h4, h5, h6')].filter(seen).map((h) => Number(h.tagName[1]));
  if (headings.filter((level) => level === 1).length !== 1) wrong.push('not one h1');
  headings.forEach((level, i) => {
    if (level > (headings[i - 1] ?? 0) + 1) wrong.push('heading ' + level + ' after ' + (headings[i - 1] ?? 'nothing'));
  });

  const textOf = (ids) => ids.split(/\\s+/).map((id) => document.getElementById(id)?.textContent ?? '').join(' ');
  const nameOf = (e) =>
    (e.getAttribute('aria-labelledby') ? textOf(e.getAttribute('aria-labelledby')) : '') ||
    e.getAttribute('aria-label') ||
    [...(e.labels ?? [])].map((label) => label.textContent).join(' ') ||
    (['A', 'BUTTON', 'SUMMARY'].includes(e.tagName) ? e.textContent : '') ||
    e.getAttribute('title') ||
    '';
  for (const e of document.querySelectorAll('a[href], button, input:not([type=hidden]), select, textarea, summary, [tabindex], [role=img], nav, dialog, table'))
    if (seen(e) && nameOf(e).trim() === '' && !(e.tagName === 'TABLE' && e.caption?.textContent.trim())) wrong.push('no name: ' + short(e));
  for (const label of document.querySelectorAll('label')) if (label.control === null) wrong.push('a label of nothing: ' + short(label));
  for (const attribute of ['aria-labelledby', 'aria-describedby', 'for'])
    for (const e of document.querySelectorAll('[' + attribute + ']'))
      for (const id of e.getAttribute(attribute).split(/\\s+/)) if (document.getElementById(id) === null) wrong.push(attribute + ' of nothing: ' + id);

  const colour = (text) => {
    const [r = 0, g = 0, b = 0, a = 1] = (text.match(/[\\d.]+/g) ?? []).map(Number);
    return { r, g, b, a };
  };
  const luminance = ({ r, g, b }) => {
    const linear = (v) => (v / 255 <= 0.04045 ? v / 255 / 12.92 : ((v / 255 + 0.055) / 1.055) ** 2.4);
    return 0.2126 * linear(r) + 0.7152 * linear(g) + 0.0722 * linear(b);
  };
  const ground = (element) => {
    for (let e = element; e !== null; e = e.parentElement) {
      const back = colour(getComputedStyle(e).backgroundColor);
      if (back.a > 0) return back;
    }
    return colour('rgb(255, 255, 255)');
  };
  const walker = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  const told = new Set();
  for (let node = walker.nextNode(); node !== null; node = walker.nextNode()) {
    const e = node.parentElement;
    if (node.data.trim() === '' || !seen(e) || e.closest('.unseen, title, clipPath, option')) continue;
    const style = getComputedStyle(e);
    const ink = colour(e.closest('svg') ? style.fill : style.color);
    const [dark, light] = [luminance(ink), luminance(ground(e))].sort((a, b) => a - b);
    const size = parseFloat(style.fontSize);
    const isLarge = size >= 24 || (size >= 18.66 && Number(style.fontWeight) >= 700);
    const ratio = (light + 0.05) / (dark + 0.05);
    const text = 'contrast ' + ratio.toFixed(2) + ' of ' + JSON.stringify(node.data.trim().slice(0, 40)) + ' in ' + (e.className?.baseVal ?? e.className);
    if (ratio < (isLarge ? 3 : 4.5) && !told.has(text)) wrong.push(text);
    told.add(text);
  }
  return wrong;
})()`;
