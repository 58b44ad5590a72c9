import { createHash } from 'node:crypto';
import { access, constants, mkdir } from 'node:fs/promises';
import type { DeliveryOutcome, Mailer } from './mailer.ts';
import { writeWhole } from './wholeFile.ts';

/**
 * Mail into a folder, one file a message and recipient. The name follows from the message, so that a message delivered again replaces
 * its own file; a reader never sees half of one.
 */
export function folderMailer(folder: string): Mailer {
  return {
    async send({ recipient, mime }) {
      const name = fileName(mime, recipient);
      try {
        await mkdir(folder, { recursive: true });
        await writeWhole(folder, name, mime, 0o600);
        return { state: 'delivered', detail: name };
      } catch (error) {
        return failed(error);
      }
    },
    async verify() {
      try {
        await mkdir(folder, { recursive: true });
        await access(folder, constants.W_OK);
        return { state: 'delivered', detail: `${folder} is ready` };
      } catch (error) {
        return failed(error);
      }
    },
  };
}

/** `20230702T031000Z-1f0c….eml`: the message's own date, so that a listing is in order. */
function fileName(mime: Buffer, recipient: string): string {
  const date = new Date(header(mime, 'Date') ?? '');
  const stamp = Number.isNaN(date.getTime()) ? 'undated' : date.toISOString().replace(/[-:]|\.\d+/g, '');
  const identity = header(mime, 'Message-ID') ?? mime.toString('latin1');
  const hash = createHash('sha256').update(`${identity}\n${recipient}`).digest('hex').slice(0, 16);
  return `${stamp}-${hash}.eml`;
}

/** The value of a header field, unfolded; null when absent. */
function header(mime: Buffer, name: string): string | null {
  const end = mime.indexOf('\r\n\r\n');
  const head = mime.toString('latin1', 0, end < 0 ? mime.length : end).replace(/\r\n[ \t]/g, ' ');
  const found = head.split('\r\n').find((line) => line.toLowerCase().startsWith(`${name.toLowerCase()}:`));
  return found === undefined ? null : found.slice(name.length + 1).trim();
}

function failed(error: unknown): DeliveryOutcome {
  return { state: 'later', detail: error instanceof Error ? error.message : String(error) };
}
