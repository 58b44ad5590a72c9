import { createHash } from 'node:crypto';
import MailComposer from 'nodemailer/lib/mail-composer';
import type { ComposedMessage, MailSetting } from '../composed.ts';
import { oneLine } from '../markup.ts';
import { POSSIBLE_DUPLICATE } from '../wording/phrases.ts';

/** Parts into the bytes of one mail (RFC 5322, 2045–2047). The same parts give the same bytes. */
export interface MailParts {
  readonly messageId: string;
  /** The first message of the thread; null: this is it. */
  readonly inReplyTo: string | null;
  readonly kind: ComposedMessage['kind'];
  readonly eventId: string | null;
  readonly recipients: readonly string[];
  readonly subject: string;
  readonly text: string;
  readonly html: string | null;
  readonly picture: { readonly cid: string; readonly fileName: string; readonly png: Buffer } | null;
  readonly attachments: readonly {
    readonly fileName: string;
    readonly contentType: string;
    readonly content: string;
  }[];
}

export async function compose(parts: MailParts, setting: Pick<MailSetting, 'from' | 'now'>): Promise<ComposedMessage> {
  const subject = oneLine(parts.subject);
  const picture = parts.picture;
  const composer = new MailComposer({
    from: oneLine(setting.from),
    to: parts.recipients.map(oneLine),
    subject,
    messageId: parts.messageId,
    date: setting.now,
    ...(parts.inReplyTo === null ? {} : { inReplyTo: parts.inReplyTo, references: parts.inReplyTo }),
    headers: { 'Auto-Submitted': 'auto-generated' },
    text: parts.text,
    ...(parts.html === null ? {} : { html: parts.html }),
    attachments: [
      ...(picture === null
        ? []
        : [{ cid: picture.cid, filename: picture.fileName, contentType: 'image/png', content: picture.png }]),
      ...parts.attachments.map((a) => ({
        filename: a.fileName,
        contentType: a.contentType,
        content: Buffer.from(a.content, 'utf8'),
      })),
    ],
    baseBoundary: createHash('sha256').update(parts.messageId).digest('hex').slice(0, 24),
    newline: 'windows',
    disableFileAccess: true,
    disableUrlAccess: true,
  });
  const mime = await composer.compile().build();
  const { messageId, kind, eventId, recipients } = parts;
  return { messageId, subject, kind, eventId, recipients, mime };
}

/**
 * The same message with `[possible duplicate]` before its subject: for a copy sent because nobody knows whether the first one
 * arrived. Message-ID and everything else stay, so that mail programs can tell that it is the same.
 */
export function markPossibleDuplicate(mime: Buffer): Buffer {
  const end = mime.indexOf('\r\n\r\n');
  const head = mime.toString('latin1', 0, end);
  const marked = head.replace(/^Subject: (?!\[possible duplicate\])/m, `Subject: [${POSSIBLE_DUPLICATE}]\r\n `);
  return Buffer.concat([Buffer.from(marked, 'latin1'), mime.subarray(end)]);
}

/** A name for an attachment that every file system takes: letters, digits, `+`, `-` and `.`. */
export function safeFileName(text: string): string {
  return (
    text
      .replace(/[^A-Za-z0-9+.-]+/g, '_')
      .replace(/^[.-]+/, '')
      .slice(0, 80) || 'event'
  );
}
