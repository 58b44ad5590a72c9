import type { BelievedStep } from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { Station } from '../station.ts';
import type { EventUpsert, IntakeBatch, PulsarReportRow } from '../store/index.ts';
import { type Alerts, planAlerts } from './alert.ts';
import { pictureOf, publishedEvents } from './decision.ts';
import { eventChanges, type KeptEvent } from './eventChanges.ts';

/** What new reports of pulsars do to the record: the part of a batch behind the deviation stage. */
export type Consequences = Pick<
  IntakeBatch,
  'reports' | 'events' | 'droppedEvents' | 'messages' | 'supersededMessages'
>;

export const NO_CONSEQUENCES: Consequences = {
  reports: [],
  events: [],
  droppedEvents: [],
  messages: [],
  supersededMessages: [],
};

/** What the detector says about the pulsars that changed, and of the clocks of all sites. */
export interface Decided {
  readonly reports: readonly PulsarReport[];
  readonly rows: readonly PulsarReportRow[];
  /** Null: the clocks could not be judged; what is on record of them stands. */
  readonly steps: readonly BelievedStep[] | null;
}

/** Decision, event and alert: from what the detector says about single pulsars to events on record and mail. */
export async function consequencesOf(
  station: Station,
  { reports, rows, steps }: Decided,
  { mail }: { readonly mail: boolean },
): Promise<Consequences> {
  const published = publishedEvents(station, rows, steps);
  const changes = eventChanges(published, station.store.publishedEvents());

  const recordedId = new Map(changes.kept.map(({ event, before }) => [event.id, before?.event.id ?? null]));
  const picture = (event: PulsarEvent) => pictureOf(station, reports, event, recordedId.get(event.id) ?? null);
  const alerts = mail ? await planAlerts(station, changes.kept, picture) : NOT_ASKED;
  return {
    reports: rows,
    events: changes.kept.map((kept) => upsertOf(kept, picture(kept.event), alerts.why.get(kept.event.id) ?? NO_MAIL)),
    droppedEvents: changes.dropped,
    messages: alerts.messages,
    supersededMessages: alerts.superseded,
  };
}

const NO_MAIL = 'not mailed: no mail was asked for';
const NOT_ASKED: Alerts = { messages: [], superseded: [], why: new Map() };

function upsertOf(
  { event, before, revision, what }: KeptEvent,
  picture: EventUpsert['picture'],
  alert: string,
): EventUpsert {
  return { event, picture, formerId: before?.event.id ?? null, revision, change: what, alert };
}
