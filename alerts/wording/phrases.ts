import type { EventState, Explanation, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { oneLine } from '../markup.ts';
import type { EventMailKind } from '../messageId.ts';
import type { AlertReason } from '../policy.ts';
import { plain } from './numbers.ts';

/** Every word about an event. A confirmed event is a *candidate* until a reviewer accepts it. */

const MEANING: Readonly<Record<Explanation, string>> = {
  glitch:
    'The pulsar appears to have spun up suddenly: pulses arrive ever earlier than the spin-down model before the event predicts.',
  'spin-down glitch':
    'The pulsar appears to have slowed suddenly: pulses arrive ever later than the spin-down model before the event predicts.',
  'slow spin-up': 'The pulsar appears to have spun up over days to weeks rather than at one instant.',
  'spin-down-rate change': 'The spin-down rate appears to have changed, with no step in the rotation frequency itself.',
  'mode switching':
    'The pulsar switches between two spin-down rates, back and forth: not a glitch. Later switches are followed without an alert.',
  'clock step':
    'Arrival times stepped by the same amount, as after a step of the site clock or a change of cabling or backend: not the pulsar.',
  'bad arrival': 'One arrival time stands off alone; those around it agree with the model.',
  'bad session': 'The arrival times of one session stand off together; the sessions around it agree with the model.',
  'dispersion step':
    'The step grows with the inverse square of the observing frequency: the dispersion measure changed, not the rotation.',
  'lost count':
    'The count of turns was lost: after a gap, or as the noise grew, no prediction tells one whole turn from the next. Alerts of this pulsar are held until one count has won again; a step that lies in the gap may stay unseen.',
};

/** Of a site whose clock was back the night after. */
const SITE_BAD_SESSION =
  'For one night the arrival times of these pulsars stood off by the same amount, and the night after they were back: the clock or the backend of the site, not the pulsars.';

export function meaningOf(event: PulsarEvent): string {
  if (event.explanation === 'bad session' && isSiteEvent(event)) return SITE_BAD_SESSION;
  return MEANING[event.explanation];
}

/** What the event is called today: `candidate glitch`, `glitch`, `suspected clock step`. */
export function eventName(event: PulsarEvent): string {
  return `${PREFIX[event.state]}${event.explanation}`;
}

const PREFIX: Readonly<Record<EventState, string>> = {
  suspected: 'suspected ',
  confirmed: 'candidate ',
  withdrawn: 'withdrawn candidate ',
  accepted: '',
  rejected: 'rejected candidate ',
};

const STATE: Readonly<Record<EventState, string>> = {
  suspected: 'suspected: evidence above the lower threshold only, no alert',
  confirmed: 'candidate: confirmed by the data, waits for a reviewer',
  withdrawn: 'withdrawn: later arrivals took the evidence away',
  accepted: 'accepted by a reviewer',
  rejected: 'rejected by a reviewer',
};

export function stateText(state: EventState): string {
  return STATE[state];
}

/** The pulsar, or the site and how many pulsars showed it. */
export function subjectOf(event: PulsarEvent): string {
  if (event.site === null) return oneLine(event.pulsar);
  const others = event.pulsars.length;
  return `${oneLine(event.site)} (${others} pulsar${others === 1 ? '' : 's'})`;
}

export function isSiteEvent(event: PulsarEvent): boolean {
  return event.site !== null;
}

/** How rare an alert this strong would be by noise alone, from the whole programme. */
export function falseAlertText(perYear: number): string {
  if (!(perYear >= 0)) return 'not known';
  if (perYear >= 1) return `about ${plain(perYear, 2)} a year by noise alone at this level`;
  if (perYear < 1e-3) return 'less than one in a thousand years by noise alone at this level';
  return `about one in ${plain(1 / perYear, 2)} years by noise alone at this level`;
}

/** `wandering` and `quiet` are the detector's own alternatives to an event. */
export function explanationName(name: string): string {
  if (name === 'wandering') return 'timing noise alone';
  if (name === 'quiet') return 'nothing but measurement noise';
  return oneLine(name);
}

/** Why this mail, in its first lines. */
export function reasonText(reason: AlertReason): string {
  return REASON[reason];
}

const REASON: Readonly<Record<AlertReason, string>> = {
  'first suspicion':
    'Suspected only: the evidence is above the lower threshold. It may well come to nothing; a mail follows when it is confirmed or withdrawn.',
  'confirmed after suspicion': 'Update: the suspected event is now confirmed by the data.',
  'first confirmation': 'First alert for this event.',
  'confirmed again': 'Confirmed again after it was withdrawn.',
  'withdrawn after it was told':
    'WITHDRAWN: later or corrected arrivals took the evidence away. Please tell those you passed it on to.',
  'explanation changed': 'Update: the most probable explanation has changed.',
  'recovery first established': 'Update: a recovery is now established.',
  'alias fell': 'Update: a size that had been possible, by whole turns between arrivals, has fallen out.',
  'size sharpened': 'Update: the size is now known much better.',
  'epoch sharpened': 'Update: the epoch is now known much better.',
  'spin-down step sharpened': 'Update: the step in the spin-down rate is now known much better.',
  'recovery sharpened': 'Update: the recovery is now known much better.',
  'suspected only': 'Suspected only: not mailed.',
  'in the digest only': 'Shown in the morning review.',
  historical: 'Confirmed by old arrivals: shown in the morning review.',
  'withdrawn before it was told': 'Withdrawn before anyone was told.',
  verdict: 'A reviewer gave a verdict.',
  'nothing new': 'Nothing new.',
};

export const DRILL_TEXT =
  'DRILL: a rehearsal with a synthetic step in a copy of the data. Nothing happened to the pulsar.';
export const NO_PICTURE = 'The plot could not be drawn; the review page has the numbers.';
export const POSSIBLE_DUPLICATE = 'possible duplicate';
export const PICTURE_TEXT = 'Phase deviation with the fit, residual to the fit, and rotation frequency against time.';
export const HEADINGS = {
  check: 'Check before you accept it',
  observe: 'What to observe next',
  history: 'What was believed when',
} as const;
export const reviewLine = 'Review page';

/** Before the subject, where the mail must not be taken for a plain alert. */
export function subjectMark(kind: EventMailKind): string {
  return { first: '', update: 'Update: ', withdrawal: 'WITHDRAWN: ', drill: 'DRILL: ' }[kind];
}

export function footerText(observatory: { readonly name: string; readonly contact: string }): string {
  return `Sent by spinvigil, the spin watch of ${oneLine(observatory.name)}. Contact: ${oneLine(observatory.contact)}.`;
}

export const TEST_MAIL = {
  subject: 'test mail',
  paragraphs: ['This is a test: the watch can send mail to you. Nothing happened to any pulsar.'],
} as const;

export function stormWords(mailedInTheHour: number): {
  readonly subject: string;
  readonly paragraphs: readonly string[];
} {
  return {
    subject: 'many events at once, event mail is held back',
    paragraphs: [
      `${mailedInTheHour} events were mailed within an hour. Further ones of this hour are not mailed one by one: all are on the review page and in the morning review. Withdrawals are still mailed.`,
      'So many at once are seldom pulsars. Check the site clock, its clock table, the Earth orientation file and the ephemeris first.',
    ],
  };
}
