import { createHash } from 'node:crypto';
import { access, constants, mkdir, open, rename } from 'node:fs/promises';
import { join } from 'node:path';
import type { DeliveryOutcome, Mailer } from './mailer.ts';

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
        await writeWhole(folder, name, mime);
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

/** The bytes are on disk under the final name, or the final name is as before: write, flush, rename, flush the folder. */
async function writeWhole(folder: string, name: string, bytes: Buffer): Promise<void> {
  const temporary = join(folder, `.${name}.tmp`);
  const file = await open(temporary, 'w', 0o600);
  try {
    await file.writeFile(bytes);
    await file.sync();
  } finally {
    await file.close();
  }
  await rename(temporary, join(folder, name));
  const directory = await open(folder, 'r');
  try {
    await directory.sync();
  } finally {
    await directory.close();
  }
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
