import { visible } from './markup.ts';

/** Plain text for mail: no line over 78 columns (RFC 5322 §2.1.1), readable in the first screen of a phone. */
export const TEXT_COLUMNS = 78;

/** Breaks at spaces; a word longer than a line (an address) keeps a line of its own, cut where it must be. */
export function wrap(text: string, layout: { readonly indent?: string; readonly first?: string } = {}): string {
  const indent = layout.indent ?? '';
  const first = layout.first ?? indent;
  const columns = TEXT_COLUMNS;
  const lines: string[] = [];
  for (const paragraph of visible(text).split('\n')) {
    let line = lines.length === 0 ? first : indent;
    let empty = true;
    for (const word of paragraph.split(/ +/).filter((w) => w !== '')) {
      for (const piece of pieces(word, columns - indent.length)) {
        if (!empty && width(line) + 1 + width(piece) > columns) {
          lines.push(line);
          line = indent;
          empty = true;
        }
        line += empty ? piece : ` ${piece}`;
        empty = false;
      }
    }
    lines.push(line.trimEnd());
  }
  return lines.join('\n');
}

export function bullets(items: readonly string[]): string {
  return items.map((item) => wrap(item, { first: '- ', indent: '  ' })).join('\n');
}

/** Label and value in two columns, values wrapped under themselves. */
export function table(rows: readonly { readonly label: string; readonly value: string }[]): string {
  const labelWidth = Math.min(24, Math.max(0, ...rows.map((r) => width(r.label)))) + 2;
  const indent = ' '.repeat(labelWidth);
  return rows.map((r) => wrap(r.value, { first: padEnd(r.label, labelWidth), indent })).join('\n');
}

export function heading(text: string): string {
  return `${text}\n${'-'.repeat(Math.min(TEXT_COLUMNS, width(text)))}`;
}

/** Columns on a fixed-width screen: combining marks, such as the dot of ν̇, take none. */
export function width(text: string): number {
  return [...text.replace(/\p{Mark}/gu, '')].length;
}

function padEnd(text: string, columns: number): string {
  const missing = columns - width(text);
  return missing > 0 ? text + ' '.repeat(missing) : `${text} `;
}

function pieces(word: string, columns: number): string[] {
  const characters = [...word];
  const all: string[] = [];
  for (let i = 0; i < characters.length; i += columns) all.push(characters.slice(i, i + columns).join(''));
  return all;
}
