import type { PulsarModel } from '../detectors/spin/pulsarModel.ts';
import type { EventPicture, PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import type { ComposedMessage, MailSetting } from './composed.ts';
import {
  figure,
  heading,
  link,
  list,
  page,
  paragraph,
  picture as pictureBlock,
  rowTable,
  type Tone,
  title,
} from './html.ts';
import { compose, safeFileName } from './mailer/index.ts';
import { oneLine } from './markup.ts';
import type { EventMailKind } from './messageId.ts';
import { eventJson } from './notice/json.ts';
import { voevent } from './notice/voevent.ts';
import { renderPng } from './picture.ts';
import { eventSvg } from './plot/index.ts';
import type { PlannedMessage } from './policy.ts';
import { bullets, table, heading as textHeading, wrap } from './text.ts';
import { type Belief, historyLines } from './wording/beliefs.ts';
import {
  DRILL_TEXT,
  footerText,
  HEADINGS,
  NO_PICTURE,
  PICTURE_TEXT,
  reasonText,
  reviewLine,
  subjectMark,
} from './wording/phrases.ts';
import { type EventSheet, eventSheet } from './wording/sheet.ts';

/** One event as a mail: what happened, how big, how sure, what to check and what to do next; the same words as text and as HTML. */
export interface EventMail {
  readonly event: PulsarEvent;
  /** Null: without a plot, also for a server that found the mail too large. */
  readonly picture: EventPicture | null;
  /** For position and spin in the notice. */
  readonly model: PulsarModel | null;
  readonly planned: PlannedMessage;
  /** The revision that the last mail told; null: nothing was told. */
  readonly toldRevision: number | null;
  /** What was believed when, oldest first, this revision the last; absent: the mail does not tell. */
  readonly history?: readonly Belief[];
}

const CID = 'event-plot@spinvigil';

export async function composeEventMail(mail: EventMail, setting: MailSetting): Promise<ComposedMessage> {
  const { event, planned, model } = mail;
  const sheet = eventSheet(event, mail.picture, setting.timezone);
  const png = await drawn(mail.picture, sheet);
  const missing = mail.picture !== null && png === null ? NO_PICTURE : null;
  const history = lately(mail.history ?? []);
  const name = safeFileName(event.id);
  const notice = voevent(event, {
    observatory: setting.observatory,
    model,
    revision: planned.revision,
    issuedAt: setting.now,
    cites: mail.toldRevision,
    drill: planned.kind === 'drill',
  });
  return compose(
    {
      messageId: planned.messageId,
      inReplyTo: planned.inReplyTo,
      kind: 'event',
      eventId: event.id,
      recipients: planned.recipients,
      subject: subjectOfMail(sheet, planned.kind, setting.observatory.name),
      text: eventText(sheet, planned, setting, { missing, history }),
      html: eventHtml(sheet, planned, setting, { shown: png !== null, missing, history }),
      picture: png === null ? null : { cid: CID, fileName: `${name}.png`, png },
      attachments: [
        { fileName: `${name}-r${planned.revision}.xml`, contentType: 'application/xml', content: notice },
        { fileName: `${name}-r${planned.revision}.json`, contentType: 'application/json', content: eventJson(event) },
      ],
    },
    setting,
  );
}

/** What stands in a mail beside the sheet. */
interface Beside {
  /** The plot is among the parts of the mail. */
  readonly shown: boolean;
  /** In words, that it is not though it should be. */
  readonly missing: string | null;
  /** Lines of what was believed before; empty: nothing else was. */
  readonly history: readonly string[];
}

/** Older beliefs are on the page. */
const BELIEFS_SHOWN = 8;

/** A first belief has no history. */
function lately(history: readonly Belief[]): readonly string[] {
  return history.length < 2 ? [] : historyLines(history.slice(-BELIEFS_SHOWN));
}

/** A plot that cannot be drawn must not hold up the alert: the mail then says that it is missing. */
async function drawn(picture: EventPicture | null, sheet: EventSheet): Promise<Buffer | null> {
  if (picture === null) return null;
  try {
    return await renderPng(eventSvg(picture, { title: sheet.title, subtitle: sheet.size }));
  } catch {
    return null;
  }
}

/** Observatory, pulsar, explanation, size. */
function subjectOfMail(sheet: EventSheet, kind: EventMailKind, observatory: string): string {
  return [`${subjectMark(kind)}${oneLine(observatory)}`, sheet.title, sheet.size]
    .filter((part) => part !== '')
    .join(' · ');
}

function eventText(
  sheet: EventSheet,
  planned: PlannedMessage,
  setting: MailSetting,
  { missing, history }: Pick<Beside, 'missing' | 'history'>,
): string {
  const drill = planned.kind === 'drill';
  const blocks = [
    drill ? wrap(opening(planned)) : '',
    [sheet.title, sheet.size]
      .filter((line) => line !== '')
      .map((line) => wrap(line))
      .join('\n'),
    drill ? '' : wrap(opening(planned)),
    wrap(sheet.meaning),
    missing === null ? '' : wrap(missing),
    sheet.caution === '' ? '' : wrap(sheet.caution),
    table(sheet.rows),
    section(HEADINGS.check, sheet.check),
    section(HEADINGS.observe, sheet.observe),
    section(HEADINGS.history, history),
    setting.reviewUrl === null ? '' : `${reviewLine}:\n${eventUrl(setting.reviewUrl, planned.eventId)}`,
    `-- \n${wrap(footerText(setting.observatory))}`,
  ];
  return `${blocks.filter((b) => b !== '').join('\n\n')}\n`;
}

function section(name: string, items: readonly string[]): string {
  return items.length === 0 ? '' : `${textHeading(name)}\n${bullets(items)}`;
}

function eventHtml(
  sheet: EventSheet,
  planned: PlannedMessage,
  setting: MailSetting,
  { shown, missing, history }: Beside,
): string {
  return page({
    title: sheet.title,
    preview: `${sheet.size} ${opening(planned)}`,
    tone: TONE[planned.kind],
    blocks: [
      planned.kind === 'drill' ? paragraph(opening(planned), 'strong') : null,
      title(sheet.title, setting.observatory.name),
      figure(sheet.size),
      planned.kind === 'drill' ? null : paragraph(opening(planned), 'strong'),
      paragraph(sheet.meaning),
      shown ? pictureBlock(CID, `${PICTURE_TEXT} ${sheet.title}. ${sheet.size}`) : null,
      missing === null ? null : paragraph(missing),
      sheet.caution === '' ? null : paragraph(sheet.caution, 'strong'),
      rowTable(sheet.rows),
      ...(sheet.check.length === 0 ? [] : [heading(HEADINGS.check), list(sheet.check)]),
      ...(sheet.observe.length === 0 ? [] : [heading(HEADINGS.observe), list(sheet.observe)]),
      ...(history.length === 0 ? [] : [heading(HEADINGS.history), list(history)]),
      setting.reviewUrl === null ? null : link(reviewLine, eventUrl(setting.reviewUrl, planned.eventId)),
    ],
    footer: footerText(setting.observatory),
  });
}

const TONE: Readonly<Record<EventMailKind, Tone>> = {
  first: 'candidate',
  update: 'update',
  withdrawal: 'withdrawal',
  drill: 'drill',
};

function opening(planned: PlannedMessage): string {
  return planned.kind === 'drill' ? DRILL_TEXT : reasonText(planned.reason);
}

/** Where the page shows the event. */
function eventUrl(reviewUrl: string, eventId: string): string {
  return `${reviewUrl}/events/${encodeURIComponent(eventId.replace(/\p{Cs}/gu, '\ufffd'))}`;
}
