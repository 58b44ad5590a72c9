import type { ComposedMessage, MailSetting } from './composed.ts';
import { heading, link, list, page, paragraph, title } from './html.ts';
import { compose } from './mailer/index.ts';
import { namedMessageId } from './messageId.ts';
import type { MorningReview } from './morningReview.ts';
import { bullets, heading as textHeading, wrap } from './text.ts';
import { morningWords } from './wording/morning.ts';
import { footerText, reviewLine } from './wording/phrases.ts';

/** The morning review as a mail, and as the `morning` command prints it. Its Message-ID is fixed by the civil date: one a day. */
export type DigestSetting = Pick<MailSetting, 'observatory' | 'timezone' | 'reviewUrl'>;

export function digestText(review: MorningReview, setting: DigestSetting): string {
  const words = morningWords(review, setting.timezone);
  const blocks = [
    wrap(`${review.observatory}: ${words.title}`),
    wrap(`${words.summary[0]?.toUpperCase()}${words.summary.slice(1)}.`),
    ...words.sections.map((s) => `${textHeading(s.heading)}\n${bullets(s.lines)}`),
    ...(setting.reviewUrl === null ? [] : [`${reviewLine}:\n${setting.reviewUrl}`]),
    `-- \n${wrap(footerText(setting.observatory))}`,
  ];
  return `${blocks.join('\n\n')}\n`;
}

export function digestHtml(review: MorningReview, setting: DigestSetting): string {
  const words = morningWords(review, setting.timezone);
  return page({
    title: words.title,
    preview: words.summary,
    tone: review.waiting.length > 0 ? 'candidate' : 'calm',
    blocks: [
      title(words.title, review.observatory),
      paragraph(`${words.summary[0]?.toUpperCase()}${words.summary.slice(1)}.`, 'strong'),
      ...words.sections.flatMap((s) => [heading(s.heading), list(s.lines)]),
      setting.reviewUrl === null ? null : link(reviewLine, setting.reviewUrl),
    ],
    footer: footerText(setting.observatory),
  });
}

export function composeDigest(
  review: MorningReview,
  recipients: readonly string[],
  setting: MailSetting,
): Promise<ComposedMessage> {
  const words = morningWords(review, setting.timezone);
  return compose(
    {
      messageId: namedMessageId(`morning.${review.date}`, setting.observatory.contact),
      inReplyTo: null,
      kind: 'digest',
      eventId: null,
      recipients,
      subject: `${review.observatory} · ${words.title}: ${words.summary}`,
      text: digestText(review, setting),
      html: digestHtml(review, setting),
      picture: null,
      attachments: [],
    },
    setting,
  );
}
