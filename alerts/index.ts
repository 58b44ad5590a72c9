/** What the daemon may call, in the order of its use: decide, compose, send. */

export { EXPIRES_AFTER_MS, hasExpired, pauseMs } from './backoff.ts';
export type { ComposedMessage, MailSetting } from './composed.ts';
export { composeDigest, digestHtml, digestText } from './digest.ts';
export {
  createMailer,
  type Delivery,
  type DeliveryOutcome,
  type Mailer,
  type MailTransport,
  markPossibleDuplicate,
  safeFileName,
  withoutPicture,
  writeWhole,
} from './mailer/index.ts';
export { composeEventMail, type EventMail } from './message.ts';
export { messageId } from './messageId.ts';
export type { MorningReview, QuarantinedRow } from './morningReview.ts';
export { eventsCsv } from './notice/csv.ts';
export { type CsvColumns, csvTable } from './notice/csvTable.ts';
export { eventJson } from './notice/json.ts';
export { type NoticeContext, voevent } from './notice/voevent.ts';
export { composeOperatorNotice, composeStormNotice, composeTestMail } from './operatorNotice.ts';
export { prepareRenderer, renderPng } from './picture.ts';
export { DARK_PALETTE, eventSvg, LIGHT_PALETTE, type PlotPalette } from './plot/index.ts';
export {
  type AlertPolicy,
  DEFAULT_HISTORICAL_DAYS,
  DEFAULT_SHARPER_BY,
  type EventChanged,
  messagesFor,
  type PlannedMessage,
  type ToldBefore,
} from './policy.ts';
export { DEFAULT_HOURLY_CAP, isQuiet, mailOrSummary, mayWake, type QuietHours } from './restraint.ts';
export { type Belief, historyLines } from './wording/beliefs.ts';
export { timeInWords } from './wording/dates.ts';
export { eventName, subjectOf } from './wording/phrases.ts';
export { eventSheet, sizeText } from './wording/sheet.ts';
