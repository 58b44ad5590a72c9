import { isUtf8 } from 'node:buffer';
import { readFileSync, statSync } from 'node:fs';

const LONGEST_BYTES = 4 * 1024 * 1024;

/** The text of one of the operator's own files, or in words why there is none. */
export function readTextFile(
  file: string,
  { longestBytes = LONGEST_BYTES }: { readonly longestBytes?: number } = {},
): { readonly text: string } | { readonly problem: string } {
  try {
    const stat = statSync(file);
    if (!stat.isFile()) return { problem: 'is not a regular file' };
    if (stat.size > longestBytes) return { problem: `is larger than ${longestBytes} bytes` };
    const bytes = readFileSync(file);
    if (!isUtf8(bytes)) return { problem: 'is not UTF-8 text' };
    return { text: bytes.toString('utf8').replace(/^\uFEFF/, '') };
  } catch (error) {
    const { code, message } = error as NodeJS.ErrnoException;
    if (code === 'ENOENT' || code === 'ENOTDIR') return { problem: 'does not exist' };
    if (code === 'EACCES') return { problem: 'cannot be read by this user' };
    return { problem: `cannot be read (${code ?? message})` };
  }
}
