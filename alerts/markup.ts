/**
 * Text into XML, HTML and SVG without surprises: every value put into a `markup` template is escaped, unless it is itself markup.
 * Names from files, configuration and reviewers reach mail and notices only through here.
 */
export class Markup {
  readonly source: string;
  constructor(source: string) {
    this.source = source;
  }
  toString(): string {
    return this.source;
  }
}

type Piece = Markup | string | number | null | readonly Piece[];

export function markup(strings: TemplateStringsArray, ...values: readonly Piece[]): Markup {
  return new Markup(
    strings.reduce((all, part, i) => all + part + (i < values.length ? rendered(values[i] ?? null) : ''), ''),
  );
}

function rendered(piece: Piece): string {
  if (piece === null) return '';
  if (piece instanceof Markup) return piece.source;
  if (typeof piece === 'object') return piece.map(rendered).join('');
  return escapeMarkup(String(piece));
}

/** For element content and for attributes in either quote. What XML 1.0 §2.2 forbids becomes U+FFFD. */
function escapeMarkup(text: string): string {
  return visible(text).replace(/[&<>"']/g, (c) => ESCAPES[c] ?? c);
}

const ESCAPES: Readonly<Record<string, string>> = {
  '&': '&amp;',
  '<': '&lt;',
  '>': '&gt;',
  '"': '&quot;',
  "'": '&#39;',
};

/** Characters that are not text: controls but tab and line feed, lone surrogates, and those that reverse or hide what follows. */
const UNSEEN = /(?![\t\n])[\p{Cc}\p{Cs}\u200b\u200e\u200f\u2028-\u202e\u2060-\u2069\ufeff\ufffe\uffff]/gu;

/** The text with every unseen character shown as U+FFFD. */
export function visible(text: string): string {
  return text.replace(/\r\n?/g, '\n').replace(UNSEEN, '\ufffd');
}

/** On one line, for headers, subjects and table cells: no value of ours can start a header of its own. */
export function oneLine(text: string): string {
  return visible(text).replace(/[\n\t]/g, '\ufffd');
}
