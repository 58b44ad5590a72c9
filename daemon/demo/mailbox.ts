import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';

/** Reads a folder of .eml files; each call returns the subjects that were not there before, one for each message. */
export function newMail(folder: string): () => readonly string[] {
  const seenFiles = new Set<string>();
  const seenMessages = new Set<string>();
  return () => {
    const names = existsSync(folder) ? readdirSync(folder).filter((name) => name.endsWith('.eml')) : [];
    return names.sort().flatMap((name) => {
      if (seenFiles.has(name)) return [];
      seenFiles.add(name);
      const head = headOf(readFileSync(join(folder, name), 'utf8'));
      const subject = decodedWords(field(head, 'Subject'));
      // The same message to another recipient is no news.
      const message = field(head, 'Message-ID') || subject;
      if (seenMessages.has(message)) return [];
      seenMessages.add(message);
      return [subject];
    });
  };
}

/** The header, unfolded (RFC 5322 §2.2.3). */
function headOf(mail: string): string {
  return mail.split(/\r?\n\r?\n/, 1)[0]!.replace(/\r?\n[ \t]+/g, ' ');
}

function field(head: string, name: string): string {
  return new RegExp(`^${name}: *(.*)$`, 'im').exec(head)?.[1]?.trim() ?? '';
}

/** Encoded words (RFC 2047) in UTF-8; white space between two of them belongs to neither. */
function decodedWords(text: string): string {
  return text
    .replace(/\?=\s+=\?/g, '?==?')
    .replace(/=\?utf-8\?([bq])\?([^?]*)\?=/gi, (_, encoding: string, word: string) =>
      encoding.toLowerCase() === 'b' ? Buffer.from(word, 'base64').toString() : quotedText(word),
    );
}

function quotedText(word: string): string {
  const bytes = word
    .replace(/_/g, ' ')
    .replace(/=([0-9A-F]{2})/gi, (_, hex: string) => String.fromCharCode(Number.parseInt(hex, 16)));
  return Buffer.from(bytes, 'latin1').toString();
}
