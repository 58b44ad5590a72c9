import type { Delays, Quality, ReceivedArrival } from '../detectors/arrival.ts';
import type { EventPicture, EventState, PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import type { Mjd } from '../detectors/time/mjd.ts';

/** What the store keeps, as plain data: the shapes that pipeline, commands and page share. Times are ISO 8601 UTC. */

/** An arrival on the log. `fate` is the log's own: the detector's verdict is derived. */
export interface ArrivalRecord extends ReceivedArrival {
  readonly key: string;
  readonly fileId: number;
  readonly line: number;
  readonly tdb: Mjd | null;
  readonly delays: Delays | null;
  readonly quality: Quality;
  readonly qualityReasons: readonly string[];
  /** `live` counts; the others stay on record and do not. */
  readonly status: 'live' | 'revised' | 'withdrawn';
  readonly reason: string;
  readonly takenInAt: string;
}

/** An arrival as received, and the line of the file that brought it. */
export interface ArrivalOrigin {
  readonly key: string;
  /** As the file had it, with all its digits. */
  readonly timeText: string;
  readonly timeScale: 'UTC' | 'TDB';
  readonly site: string;
  readonly receiver: string;
  /** Infinite: dispersion was removed before. */
  readonly frequencyMhz: number;
  readonly uncertaintyUs: number;
  readonly status: 'live' | 'revised' | 'withdrawn';
  readonly feed: string;
  readonly file: string;
  readonly line: number;
  readonly takenInAt: string;
}

export interface FileRecord {
  readonly id: number;
  readonly feed: string;
  /** Relative to the feed's folder, escaped for display where the name is not UTF-8. */
  readonly path: string;
  readonly sha256: string;
  readonly bytes: number;
  readonly takenInAt: string;
  /** rows = stored + same + revised + quarantined */
  readonly rows: number;
  readonly stored: number;
  readonly same: number;
  readonly revised: number;
  readonly quarantined: number;
  /** Set when the whole file could not be read. */
  readonly fault: string | null;
}

/** An event as a list shows it. */
export interface ListedEvent {
  /** Its `state` is the shown one: a standing verdict, else the detector's own. */
  readonly event: PulsarEvent;
  /** What the detector holds, whatever the reviewer said. */
  readonly detectorState: EventState;
  /** As the detector held it at the last revision: what `event` differs by was not worth one. Compare a new decision with this. */
  readonly lastKept: PulsarEvent;
  /** 1 for the first; grows by one at each change worth keeping, a verdict included. */
  readonly revision: number;
  /** Somebody knows of it: a mail may have left, or a reviewer judged. Such an event is withdrawn, never dropped. */
  readonly told: boolean;
  readonly createdAt: string;
  readonly changedAt: string;
}

/** An event with its life on record. */
export interface EventRecord extends ListedEvent {
  /** Ids it had before late data moved it, oldest first. */
  readonly formerIds: readonly string[];
  readonly picture: EventPicture | null;
  readonly history: readonly EventChange[];
  readonly verdicts: readonly VerdictRecord[];
}

export interface EventChange {
  readonly revision: number;
  readonly at: string;
  /** In words; a verdict is one of the changes. */
  readonly what: string;
  /** `mailed: size sharpened`, `not mailed: suspected only`; absent or null: from before this was kept. */
  readonly alert?: string | null;
  /** As the detector held it then, its state included. */
  readonly event: PulsarEvent;
}

export interface VerdictRecord {
  readonly verdict: 'accept' | 'reject' | 'reopen';
  readonly by: string;
  readonly note: string;
  readonly at: string;
  /** The event's revision that was judged. */
  readonly revision: number;
}

export interface OutboxRecord {
  readonly id: number;
  readonly messageId: string;
  readonly recipient: string;
  readonly subject: string;
  readonly kind: 'event' | 'digest' | 'notice' | 'test';
  readonly eventId: string | null;
  readonly state: 'queued' | 'attempting' | 'delivered' | 'refused' | 'expired';
  readonly attempts: number;
  readonly dueAt: string;
  readonly lastError: string | null;
  /** An earlier attempt may have arrived: the copy says so. */
  readonly possibleDuplicate: boolean;
  readonly createdAt: string;
  /** Held until then; else when it was queued. */
  readonly mayLeaveAt: string;
  readonly deliveredAt: string | null;
}

/** One try at one message to one recipient. */
export interface MailAttempt {
  readonly begunAt: string;
  /** In words; null: under way. */
  readonly outcome: string | null;
}
