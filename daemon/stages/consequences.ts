import type { PulsarReport } from '../../detectors/report.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { Station } from '../station.ts';
import type { EventUpsert, IntakeBatch, PulsarReportRow } from '../store/index.ts';
import { planAlerts } from './alert.ts';
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

/** Decision, event and alert: from what the detector says about single pulsars to events on record and mail. */
export async function consequencesOf(
  station: Station,
  { reports, rows }: { readonly reports: readonly PulsarReport[]; readonly rows: readonly PulsarReportRow[] },
  { mail }: { readonly mail: boolean },
): Promise<Consequences> {
  const published = publishedEvents(station, rows);
  const changes = eventChanges(published, station.store.publishedEvents());

  const recordedId = new Map(changes.kept.map(({ event, before }) => [event.id, before?.event.id ?? null]));
  const picture = (event: PulsarEvent) => pictureOf(station, reports, event, recordedId.get(event.id) ?? null);
  const alerts = mail ? await planAlerts(station, changes.kept, picture) : { messages: [], superseded: [] };
  return {
    reports: rows,
    events: changes.kept.map((kept) => upsertOf(kept, picture(kept.event))),
    droppedEvents: changes.dropped,
    messages: alerts.messages,
    supersededMessages: alerts.superseded,
  };
}

function upsertOf({ event, before, revision, what }: KeptEvent, picture: EventUpsert['picture']): EventUpsert {
  return { event, picture, formerId: before?.event.id ?? null, revision, change: what };
}
