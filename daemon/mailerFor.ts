import { createMailer, type Mailer } from '../alerts/index.ts';
import type { MailSettings } from './config/configuration.ts';
import { readMailPassword } from './config/secrets.ts';

/** The mailer for `[mail]`, with a password that is read anew at each login and kept nowhere. */
export function mailerFor({ transport }: MailSettings): Mailer {
  return createMailer(transport, {
    password() {
      if (transport.kind !== 'smtp' || transport.user === null) return null;
      const read = readMailPassword(transport.passwordFile);
      if ('problem' in read) throw new Error(read.problem);
      return read.secret.reveal();
    },
  });
}
