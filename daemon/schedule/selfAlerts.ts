import { composeOperatorNotice } from '../../alerts/index.ts';
import { newMessage } from '../stages/alert.ts';
import { mailSetting, type Station } from '../station.ts';
import { type Trouble, type TroubleKind, type TroubleSources, troubles } from './troubles.ts';

/** Tells the operators of trouble when it begins: once, all of a kind in one mail, and not again while it lasts or comes back within a day. */
export interface SelfAlerts {
  /** Answers how many notices were queued. */
  run(): Promise<number>;
}

/** Trouble on record: kind and key → when it was seen last. */
type Seen = Record<string, string>;

const SEEN = 'troubles_seen';
const FORGET_AFTER_MS = 86_400_000;
/** The record is not written at every look. */
const NOTE_AGAIN_AFTER_MS = 3_600_000;
const LOOK_EVERY_MS = 300_000;
const NAMED = 20;

const SUBJECT: Readonly<Record<TroubleKind, string>> = {
  'files quarantined': 'files could not be used',
  'table ended': 'a table is out of date',
  'disk nearly full': 'the disk is nearly full',
  'count not settled': 'pulsars without a settled count: no alerts from these',
  'clocks not judged': 'the clocks of the sites could not be judged',
  'mail blocked': 'mail does not reach everybody',
};

const ADVICE: Readonly<Record<TroubleKind, string>> = {
  'files quarantined':
    'Their rows are not in the record. The page Feeds and the morning review give every reason; “spinvigil check FILE” tries a file. A corrected file of the same name is taken in by itself.',
  'table ended':
    'The watch goes on. Arrivals beyond the end of a table are marked, and are timed again when a newer one is in place.',
  'disk nearly full':
    'When it is full, intake pauses; nothing is lost. Make room, or move the state folder with the watch stopped.',
  'count not settled':
    'No prediction tells one whole turn from the next: after a gap, or because the model does not fit. A step may stay unseen meanwhile. Observe it closely, or give it a newer model.',
  'clocks not judged':
    'A fault of the program; the log says where. Pulsars are decided about with the steps known so far, but a new step of a clock would look like a glitch of every pulsar of its site: vet those together. It is tried again with every file.',
  'mail blocked': 'It is tried again for five days. Tell these people in another way, and look at the mail server.',
};

export function createSelfAlerts(station: Station, extra: Pick<TroubleSources, 'freeBytes'> = {}): SelfAlerts {
  const { store, clock, log } = station;
  let lookedAtMs = Number.NEGATIVE_INFINITY;
  return {
    async run() {
      if (clock.monotonicMs() - lookedAtMs < LOOK_EVERY_MS) return 0;
      lookedAtMs = clock.monotonicMs();
      const nowMs = clock.now().getTime();
      const before = JSON.parse(store.meta(SEEN) ?? '{}') as Seen;
      const present = troubles({ ...station, ...extra });
      const began = present.filter(({ kind, key }) => !isFresh(before[`${kind}: ${key}`], nowMs, FORGET_AFTER_MS));
      const kinds = new Set(began.map(({ kind }) => kind));
      for (const kind of kinds) {
        const some = began.filter((trouble) => trouble.kind === kind);
        for (const { line } of some) log.warn({ kind, trouble: line }, 'trouble with the watch itself');
        Object.assign(before, seenNow(before, some, nowMs));
        await tell(station, kind, some, { [SEEN]: JSON.stringify(before) });
      }
      noteStillSeen(station, before, present);
      return kinds.size;
    },
  };
}

function isFresh(seenAt: string | undefined, nowMs: number, withinMs: number): boolean {
  return seenAt !== undefined && Math.abs(nowMs - Date.parse(seenAt)) < withinMs;
}

function seenNow(before: Seen, some: readonly Trouble[], nowMs: number): Seen {
  const at = new Date(nowMs).toISOString();
  return { ...before, ...Object.fromEntries(some.map(({ kind, key }) => [`${kind}: ${key}`, at])) };
}

/** What lasts is seen again; what ended a day ago is forgotten. */
function noteStillSeen({ store, clock }: Station, before: Seen, present: readonly Trouble[]): void {
  const nowMs = clock.now().getTime();
  const old = present.filter(({ kind, key }) => !isFresh(before[`${kind}: ${key}`], nowMs, NOTE_AGAIN_AFTER_MS));
  const kept = Object.entries(seenNow(before, old, nowMs)).filter(([, at]) => isFresh(at, nowMs, FORGET_AFTER_MS));
  if (old.length > 0 || kept.length < Object.keys(before).length)
    store.setMeta(SEEN, JSON.stringify(Object.fromEntries(kept)));
}

async function tell(
  station: Station,
  kind: TroubleKind,
  some: readonly Trouble[],
  remember: Readonly<Record<string, string>>,
): Promise<void> {
  const { mail, observatory } = station.configuration;
  const setting = mailSetting(station);
  const operators = [...new Set([...mail.to, observatory.contact])];
  const unreachable = new Set(some.map((trouble) => trouble.unreachable));
  const reachable = operators.filter((address) => !unreachable.has(address));
  const more = some.length - NAMED;
  const notice = {
    name: `trouble.${kind.replaceAll(' ', '-')}.${setting.now.getTime()}`,
    subject: SUBJECT[kind],
    paragraphs: [
      ...some.slice(0, NAMED).map(({ line }) => line),
      ...(more > 0 ? [`and ${more} more`] : []),
      ADVICE[kind],
    ],
  };
  // Nobody can be reached: they will at least know for how long that was so.
  const composed = await composeOperatorNotice(notice, reachable.length > 0 ? reachable : operators, setting);
  station.store.commitNotice(newMessage(composed, null, setting.now), setting.now.toISOString(), remember);
}
