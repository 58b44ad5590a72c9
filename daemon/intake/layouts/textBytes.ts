import type { SortedRows } from '../rows.ts';

/** What stands at the two ends of a text file besides text. */

const LF = 0x0a;

export interface TextBody {
  readonly bytes: Buffer;
  /** Length of a run of zero bytes at the end, taken off: what some file systems leave after a crash. */
  readonly zeros: number;
  /** The last line has no end. */
  readonly open: boolean;
}

/** The text without its byte order mark and its tail of zeros, or why it is none. */
export function textBody(received: Buffer): TextBody | { readonly fault: string } {
  if (received.length === 0) return { fault: 'is empty' };
  const [first, second] = received;
  if ((first === 0xff && second === 0xfe) || (first === 0xfe && second === 0xff)) {
    return { fault: 'is UTF-16 text; deliver it as UTF-8' };
  }
  const hasMark = first === 0xef && second === 0xbb && received[2] === 0xbf;
  let zeros = 0;
  while (zeros < received.length && received[received.length - 1 - zeros] === 0) zeros += 1;
  const bytes = received.subarray(hasMark ? 3 : 0, received.length - zeros);
  return { bytes, zeros, open: bytes.at(-1) !== LF };
}

/** The number of the line in which a text ends. */
function lastLine(bytes: Buffer): number {
  let line = 1;
  for (let at = bytes.indexOf(LF); at >= 0; at = bytes.indexOf(LF, at + 1)) line += 1;
  return line;
}

/** Zeros behind a line end cost nothing but a note; zeros behind half a row mean that the row was cut. */
export function giveUpCutRow({ bytes, zeros, open }: TextBody, { rows, rejects }: SortedRows): void {
  const line = lastLine(bytes);
  if (open && rows.at(-1)?.line === line) rows.pop();
  if (rejects.at(-1)?.line !== line) {
    rejects.push({ line, column: null, reason: `${zeros} zero bytes stand at the end of the file` });
  }
}
