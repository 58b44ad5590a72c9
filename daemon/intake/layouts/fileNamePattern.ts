import { type FileNamePart, type FileNamePattern, PLACEHOLDERS, type Placeholder } from './textColumns.ts';

/**
 * What a feed's files are called: `{pulsar}_{receiver}_*.txt`. A gap in braces takes as few characters as will do, `{pulsar:7}`
 * exactly so many, and `*` passes over any. Matching goes through the name once: no name can make it slow.
 */
export function parseFileNamePattern(text: string): FileNamePattern | { readonly problem: string } {
  const parts: FileNamePart[] = [];
  for (const piece of text.match(/\{[^{}]*\}|\*|[^{}*]+|[{}]/g) ?? []) {
    if (piece === '{' || piece === '}') return { problem: `the brace "${piece}" stands alone` };
    const isGap = piece === '*' || piece.startsWith('{');
    const before = parts.at(-1);
    if (isGap && before?.kind === 'gap' && before.length === null) {
      return { problem: `"${piece}" follows a gap of any length: text must stand between them` };
    }
    const part = isGap ? gapOf(piece) : ({ kind: 'text', text: piece } as const);
    if ('problem' in part) return part;
    parts.push(part);
  }
  const names = parts.flatMap((part) => (part.kind === 'gap' && part.place !== null ? [part.place] : []));
  const twice = names.find((name, index) => names.indexOf(name) < index);
  return twice === undefined ? parts : { problem: `{${twice}} stands there twice` };
}

function gapOf(piece: string): FileNamePart | { readonly problem: string } {
  if (piece === '*') return { kind: 'gap', place: null, length: null };
  const match = /^\{([a-z]+)(?::([1-9][0-9]{0,2}))?\}$/.exec(piece);
  const place = PLACEHOLDERS.find((name) => name === match?.[1]);
  if (match === null || place === undefined) {
    return {
      problem: `"${piece}" is not one of ${PLACEHOLDERS.map((name) => `{${name}}`).join(', ')}, or {${PLACEHOLDERS[0]}:7}`,
    };
  }
  return { kind: 'gap', place, length: match[2] === undefined ? null : Number(match[2]) };
}

/** What stands in the gaps of a name; null: the name does not fit. */
export function matchFileName(pattern: FileNamePattern, name: string): ReadonlyMap<Placeholder, string> | null {
  const found = new Map<Placeholder, string>();
  let at = 0;
  for (const [index, part] of pattern.entries()) {
    let end: number;
    if (part.kind === 'text') {
      if (!name.startsWith(part.text, at)) return null;
      end = at + part.text.length;
    } else {
      end = part.length === null ? gapEnd(pattern, index, name, at) : at + part.length;
      if (end < at || end > name.length || (part.place !== null && end === at)) return null;
      if (part.place !== null) found.set(part.place, name.slice(at, end));
    }
    at = end;
  }
  return at === name.length ? found : null;
}

/** Where the text behind a gap begins, the last one at the name's very end; −1: nowhere. */
function gapEnd(pattern: FileNamePattern, index: number, name: string, at: number): number {
  const [part, next] = [pattern[index]!, pattern[index + 1]];
  if (next?.kind !== 'text') return name.length;
  if (index + 2 === pattern.length) return name.endsWith(next.text) ? name.length - next.text.length : -1;
  const isNamed = part.kind === 'gap' && part.place !== null;
  return name.indexOf(next.text, isNamed ? at + 1 : at);
}
