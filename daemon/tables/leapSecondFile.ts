import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { type LeapSecondTable, parseLeapSeconds } from '../../detectors/time/leapSeconds.ts';

export type LeapSecondFile =
  | { readonly table: LeapSecondTable }
  | { readonly table: null; readonly absent: boolean; readonly problem: string };

/** Reads a `leap-seconds.list` and holds it against the SHA-1 line in it. */
export function readLeapSecondFile(file: string): LeapSecondFile {
  let text: string;
  try {
    text = readFileSync(file, 'utf8');
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? error.code : undefined;
    return { table: null, absent: code === 'ENOENT', problem: `${file}: cannot be read (${code ?? error})` };
  }
  const parsed = parseLeapSeconds(text);
  if ('problem' in parsed) return { table: null, absent: false, problem: `${file}: ${parsed.problem}` };
  if (!sha1LineHolds(text))
    return { table: null, absent: false, problem: `${file}: its SHA-1 line does not fit its content` };
  return { table: parsed.table };
}

/**
 * The list's own rule: the digest is over the digits of the update stamp (#$), the expiry stamp (#@) and the data rows, without blanks and
 * comments; on the line #h it stands as five groups whose leading zeros may be missing.
 */
function sha1LineHolds(text: string): boolean {
  const hash = createHash('sha1');
  let stated: string | null = null;
  for (const line of text.split(/\r?\n/)) {
    if (line.startsWith('#h')) {
      stated = line
        .slice(2)
        .trim()
        .split(/\s+/)
        .map((group) => group.padStart(8, '0'))
        .join('');
    } else if (line.startsWith('#$') || line.startsWith('#@')) {
      hash.update(line.slice(2).replace(/\s/g, ''));
    } else if (!line.startsWith('#')) {
      hash.update(line.replace(/#.*$/, '').replace(/\s/g, ''));
    }
  }
  return stated !== null && hash.digest('hex') === stated.toLowerCase();
}
