import type { VerdictRecord } from '../records.ts';

/** What a reviewer typed, checked as far as it can be without looking at the event. */
export interface VerdictDraft {
  readonly verdict: VerdictRecord['verdict'] | null;
  readonly by: string;
  readonly note: string;
}

export interface SubmittedVerdict {
  readonly draft: VerdictDraft;
  readonly revision: number;
  readonly token: string;
}

export const LONGEST_NOTE = 4000;
export const LONGEST_NAME = 100;
/** A note of 4000 characters outside the basic plane, percent-encoded, takes 48 kB. */
export const LARGEST_FORM_BYTES = 64 * 1024;
const VERDICTS = ['accept', 'reject', 'reopen'] as const;

/**
 * Reads an `application/x-www-form-urlencoded` body strictly (WHATWG URL standard, §5.1, but nothing is repaired):
 * bad UTF-8, a bad percent escape, an unknown field or a field given twice is null.
 */
export function readSubmittedVerdict(body: Uint8Array): SubmittedVerdict | null {
  const fields = readForm(body, ['verdict', 'by', 'note', 'revision', 'token']);
  if (fields === null) return null;
  const revisionText = fields.get('revision') ?? '';
  if (!/^[0-9]{1,9}$/.test(revisionText)) return null;
  return {
    draft: {
      verdict: VERDICTS.find((verdict) => verdict === fields.get('verdict')) ?? null,
      by: plainText(fields.get('by') ?? '').trim(),
      note: plainText(fields.get('note') ?? '').trim(),
    },
    revision: Number(revisionText),
    token: fields.get('token') ?? '',
  };
}

/** What keeps the draft from being signed, in words for the reviewer; null when nothing does. */
export function complaintAbout(draft: VerdictDraft, reviewers: readonly string[]): string | null {
  if (draft.verdict === null) return 'Choose a verdict: accept, reject or reopen.';
  if (draft.by === '') return 'A verdict is signed: give the name of the reviewer.';
  if (lengthOf(draft.by) > LONGEST_NAME) return `The name is longer than ${LONGEST_NAME} characters.`;
  if (draft.by.includes('\n')) return 'The name must be on one line.';
  if (reviewers.length > 0 && !reviewers.includes(draft.by)) return 'The name is not among the configured reviewers.';
  if (lengthOf(draft.note) > LONGEST_NOTE) {
    return `The note has ${lengthOf(draft.note)} characters; at most ${LONGEST_NOTE} are kept. Shorten it.`;
  }
  return null;
}

/** Counted as a reader counts, not in UTF-16 halves; line ends count once. */
function lengthOf(text: string): number {
  return [...text].length;
}

/** Line ends become LF; other control characters, which no keyboard sends, become U+FFFD. */
function plainText(text: string): string {
  return text.replace(/\r\n?/g, '\n').replace(/[^\P{Cc}\n\t]/gu, '\ufffd');
}

/** Null for a body that is no form, or that has a field besides those that are known. */
export function readForm(body: Uint8Array, known: readonly string[]): Map<string, string> | null {
  const fields = new Map<string, string>();
  try {
    const text = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(body);
    for (const pair of text.split('&')) {
      if (pair === '') continue;
      const cut = pair.indexOf('=');
      const [name, value] = cut < 0 ? [pair, ''] : [pair.slice(0, cut), pair.slice(cut + 1)];
      const decodedName = decodeURIComponent(name.replaceAll('+', ' '));
      if (fields.has(decodedName) || !known.includes(decodedName)) return null;
      fields.set(decodedName, decodeURIComponent(value.replaceAll('+', ' ')));
    }
  } catch {
    return null;
  }
  return fields;
}
