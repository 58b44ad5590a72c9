/** Text from outside, made safe to read: control, direction, separator and unassigned characters cannot pose as something else. */
const HIDDEN = /[\p{C}\p{Zl}\p{Zp}]/u;
const HIDDEN_OR_BACKSLASH = /[\\\p{C}\p{Zl}\p{Zp}]/gu;

export function hasHiddenCharacters(text: string): boolean {
  return HIDDEN.test(text);
}

/** One writing for each text: what is hidden becomes `\u{…}`, a backslash two of them. */
export function visibleText(text: string): string {
  return text.replace(HIDDEN_OR_BACKSLASH, (character) =>
    character === '\\' ? '\\\\' : `\\u{${character.codePointAt(0)!.toString(16)}}`,
  );
}

const LONGEST_QUOTE = 60;

/** For a sentence: in quotes, visible, and cut where it is long. */
export function quoted(text: string): string {
  return text.length <= LONGEST_QUOTE ? `"${visibleText(text)}"` : `"${visibleText(text.slice(0, LONGEST_QUOTE))}…"`;
}
