import type { ComposedMessage, MailSetting } from './composed.ts';
import { page, paragraph, title } from './html.ts';
import { compose } from './mailer/index.ts';
import { namedMessageId } from './messageId.ts';
import { wrap } from './text.ts';
import { momentText } from './wording/dates.ts';
import { footerText, stormWords, TEST_MAIL } from './wording/phrases.ts';

/** A mail from the daemon about itself: an address that refuses mail, mail that expired, a storm of events. */
export interface OperatorNotice {
  /** What makes it one message, such as `refused-17`: names it in the Message-ID. */
  readonly name: string;
  readonly subject: string;
  readonly paragraphs: readonly string[];
}

export function composeOperatorNotice(
  notice: OperatorNotice,
  recipients: readonly string[],
  setting: MailSetting,
): Promise<ComposedMessage> {
  return composePlain(notice, 'notice', recipients, setting);
}

/** Instead of the mails beyond the hourly cap: `name` of the hour, so that there is one an hour. */
export function composeStormNotice(
  storm: { readonly name: string; readonly mailedInTheHour: number },
  recipients: readonly string[],
  setting: MailSetting,
): Promise<ComposedMessage> {
  return composePlain({ name: storm.name, ...stormWords(storm.mailedInTheHour) }, 'notice', recipients, setting);
}

/** `check --send-test-mail`. */
export function composeTestMail(recipients: readonly string[], setting: MailSetting): Promise<ComposedMessage> {
  const when = `Sent ${momentText(setting.now, setting.timezone)}.`;
  const words = {
    name: `test.${setting.now.getTime()}`,
    subject: TEST_MAIL.subject,
    paragraphs: [...TEST_MAIL.paragraphs, when],
  };
  return composePlain(words, 'test', recipients, setting);
}

function composePlain(
  { name, subject, paragraphs }: OperatorNotice,
  kind: ComposedMessage['kind'],
  recipients: readonly string[],
  setting: MailSetting,
): Promise<ComposedMessage> {
  const footer = footerText(setting.observatory);
  const link = setting.reviewUrl === null ? [] : [setting.reviewUrl];
  const text = [wrap(subject), ...[...paragraphs, ...link].map((p) => wrap(p)), `-- \n${wrap(footer)}`].join('\n\n');
  const blocks = [title(subject, setting.observatory.name), ...[...paragraphs, ...link].map((p) => paragraph(p))];
  return compose(
    {
      messageId: namedMessageId(`${kind}.${name}`, setting.observatory.contact),
      inReplyTo: null,
      kind,
      eventId: null,
      recipients,
      subject: `${setting.observatory.name} · ${subject}`,
      text: `${text}\n`,
      html: page({ title: subject, preview: paragraphs[0] ?? '', tone: 'calm', blocks, footer }),
      picture: null,
      attachments: [],
    },
    setting,
  );
}
