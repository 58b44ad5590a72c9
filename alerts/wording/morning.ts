import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { oneLine } from '../markup.ts';
import type { MorningReview } from '../morningReview.ts';
import { epochText, mjdText, momentText, timeInWords } from './dates.ts';
import { falseAlertLines } from './falseAlerts.ts';
import { percent, plain, power } from './numbers.ts';
import { isSiteEvent } from './phrases.ts';
import { eventSheet } from './sheet.ts';

/** The morning review in words, section by section; text and HTML only set it in type. Sections with nothing to say are left out. */
export interface MorningWords {
  readonly title: string;
  readonly summary: string;
  readonly sections: readonly MorningSection[];
}

export interface MorningSection {
  readonly heading: string;
  readonly lines: readonly string[];
}

/** Longer lists are cut with a count of the rest: the page has all. */
const LONGEST_LIST = 25;

export function morningWords(review: MorningReview, timezone: string): MorningWords {
  const site = review.waiting.filter(isSiteEvent);
  const pulsar = review.waiting.filter((event) => !isSiteEvent(event));
  const one = (event: PulsarEvent) => eventLine(event, timezone);
  const sections = [
    section('Waits for your verdict, most credible first', pulsar.map(one)),
    section('Site events', site.map(one)),
    section(
      'Withdrawn or changed',
      review.changed.map(
        ({ event, what, at }) => `${one(event)}. ${oneLine(what)}, ${momentText(new Date(at), timezone)}.`,
      ),
    ),
    section('Suspected', review.suspected.map(one)),
    section(
      'Mail held back',
      review.heldBack.map(
        ({ event, why, at }) => `${one(event)}. ${momentText(new Date(at), timezone)}: ${oneLine(why)}.`,
      ),
    ),
    section('Needs attention', attention(review)),
    section(
      'Quarantined',
      review.quarantined.map(
        (q) =>
          `${oneLine(q.feed)}: ${oneLine(q.file)}${q.line === null ? ' (whole file)' : `, line ${q.line}`}: ${oneLine(q.reason)}`,
      ),
    ),
    section(
      'Silent feeds',
      review.silentFeeds.map(
        (f) =>
          `${oneLine(f.feed)}: nothing for ${timeInWords(f.hoursSilent)}, expected every ${timeInWords(f.expectedHours)}`,
      ),
    ),
    section(
      'Silent pulsars',
      review.silentPulsars.map(
        (p) => `${oneLine(p.pulsar)}: last arrival ${mjdText(p.lastArrivalMjd)}, ${plain(p.daysSilent, 2)} d ago`,
      ),
    ),
    section('Pulse count not settled: no alerts from these', review.unlockedPulsars.map(oneLine)),
    { heading: 'What was looked at', lines: lookedAt(review, timezone) },
    { heading: 'False alerts', lines: falseAlertLines(review.falseAlerts) },
  ].filter((s) => s.lines.length > 0);
  return { title: `Morning review ${oneLine(review.date)}`, summary: summaryOf(review), sections };
}

/** What a reader must know from the subject line alone. */
function summaryOf(review: MorningReview): string {
  const counts = [
    counted(review.waiting.length, 'event waits', 'events wait', ' for a verdict'),
    counted(review.changed.length, 'event changed', 'events changed', ''),
    counted(review.suspected.length, 'suspected', 'suspected', ''),
    counted(review.quarantined.length, 'quarantined row', 'quarantined rows', ''),
    counted(review.silentFeeds.length, 'silent feed', 'silent feeds', ''),
    counted(review.silentPulsars.length, 'silent pulsar', 'silent pulsars', ''),
    counted(review.unlockedPulsars.length, 'pulsar without a settled count', 'pulsars without a settled count', ''),
    counted(attention(review).length, 'warning', 'warnings', ''),
  ].filter((text) => text !== '');
  if (counts.length > 0) return counts.join(', ');
  return review.intake.arrivals === 0 ? 'no arrivals: silence says nothing' : 'all quiet';
}

function counted(count: number, one: string, many: string, rest: string): string {
  return count === 0 ? '' : `${count} ${count === 1 ? one : many}${rest}`;
}

function section(heading: string, lines: readonly string[]): MorningSection {
  const more = lines.length - LONGEST_LIST;
  return {
    heading,
    lines: more > 0 ? [...lines.slice(0, LONGEST_LIST), `and ${more} more on the review page`] : lines,
  };
}

function eventLine(event: PulsarEvent, timezone: string): string {
  const { title, size } = eventSheet(event, null, timezone);
  const own = event.explanations[event.explanation] ?? 0;
  const parts = [title, size, epochText(event.epochMjd, event.epochInterval68), percent(own)].filter(
    (part) => part !== '',
  );
  return `${parts.join(', ')} [${oneLine(event.id)}]`;
}

function attention({ warnings, mail }: MorningReview): string[] {
  const lines = warnings.map(oneLine);
  if (mail.waiting > 0) {
    const oldest = mail.oldestWaitingHours === null ? '' : `, the oldest for ${plain(mail.oldestWaitingHours, 2)} h`;
    lines.push(`${mail.waiting} ${mail.waiting === 1 ? 'mail waits' : 'mails wait'} to be sent${oldest}`);
  }
  for (const { subject, recipient, why } of mail.undelivered) {
    lines.push(`“${oneLine(subject)}” did not reach ${oneLine(recipient)}: ${oneLine(why)}`);
  }
  return lines;
}

/** "Nothing happened" is worth reading only with "and we would have seen it". */
function lookedAt(review: MorningReview, timezone: string): string[] {
  const { files, arrivals, pulsars } = review.intake;
  const span = `from ${momentText(new Date(review.since), timezone)} to ${momentText(new Date(review.until), timezone)}`;
  if (arrivals === 0) return [`No arrivals were taken in ${span}. Silence says nothing about the pulsars.`];
  const taken = `${arrivals} ${arrivals === 1 ? 'arrival' : 'arrivals'} of ${pulsars} ${pulsars === 1 ? 'pulsar' : 'pulsars'} in ${files} ${files === 1 ? 'file' : 'files'}, ${span}.`;
  return [taken, ...limitLines(review)];
}

/** So many are read in the morning; the page and the command have all. */
const BLINDEST = 7;

function limitLines({ limits }: MorningReview): string[] {
  const known = limits.toSorted((a, b) => b.deltaNuOverNu90 - a.deltaNuOverNu90);
  const middle = known[Math.floor(known.length / 2)];
  if (middle === undefined) return [];
  const one = ({ pulsar, deltaNuOverNu90, delayDays90 }: MorningReview['limits'][number]) =>
    `${oneLine(pulsar)}: Δν/ν = ${power(deltaNuOverNu90)} or more, within ${plain(delayDays90, 2)} d`;
  const lines = [
    `A glitch would have been confirmed with 90 % probability${known.length === 1 ? '' : `, in half of ${known.length} pulsars from Δν/ν = ${power(middle.deltaNuOverNu90)} on`}. The blindest first:`,
    ...known.slice(0, BLINDEST).map(one),
  ];
  const more = known.length - BLINDEST;
  return more > 0 ? [...lines, `and ${more} that would have shown less (spinvigil limits lists them)`] : lines;
}
