import { folderMailer } from './folder.ts';
import type { Mailer, MailerDependencies, MailTransport } from './mailer.ts';
import { smtpMailer } from './smtp.ts';

export { compose, markPossibleDuplicate, safeFileName } from './compose.ts';
export type { Delivery, DeliveryOutcome, Mailer, MailTransport } from './mailer.ts';
export { writeWhole } from './wholeFile.ts';
export { withoutPicture } from './withoutPicture.ts';

/** @throws Error for a server that would get the mail over an open network in plain text */
export function createMailer(transport: MailTransport, dependencies: MailerDependencies): Mailer {
  return transport.kind === 'folder' ? folderMailer(transport.folder) : smtpMailer(transport, dependencies);
}
