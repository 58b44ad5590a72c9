import { type BelievedStep, siteEvents } from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { Station } from '../station.ts';
import type { PulsarReportRow } from '../store/index.ts';

/** What is published: the pulsars' own events, and the steps that whole sites show as events of the sites. */
export function publishedEvents(
  { store }: Station,
  changed: readonly PulsarReportRow[],
  steps: readonly BelievedStep[] | null,
): readonly PulsarEvent[] {
  const rows = new Map(store.pulsarReports().map((report) => [report.pulsar, report]));
  for (const report of changed) rows.set(report.pulsar, report);
  // Only a site's event bears a site.
  const own = [...rows.values()].flatMap(({ events }) => events.map((event) => ({ ...event, site: null })));
  const ofSites = steps === null ? siteEventsOnRecord(store) : siteEvents(steps);
  return [...own, ...ofSites].sort((a, b) => a.epochMjd - b.epochMjd || (a.id < b.id ? -1 : 1));
}

function siteEventsOnRecord(store: Station['store']): PulsarEvent[] {
  const all = store.publishedEvents().map(({ event }) => event);
  return all.filter(({ site, state }) => site !== null && state !== 'withdrawn');
}

/** A report as the record keeps it. */
export function reportRow(station: Station, report: PulsarReport): PulsarReportRow {
  const model = station.configuration.models.get(report.pulsar);
  if (model === undefined) throw new Error(`${report.pulsar} has no model`);
  const { pulsar, events, locked, noise, lastArrivalMjd, limit, arrivals, recent } = report;
  const basis = station.basisOf(model);
  return { pulsar, basis, events, locked, noise, lastArrivalMjd, limit, arrivals: arrivals.length, recent };
}

/** The picture of an event: the new one, or the one on record where its pulsar was not looked at this time. */
export function pictureOf(
  station: Station,
  reports: readonly PulsarReport[],
  event: PulsarEvent,
  recordedId: string | null,
): EventPicture | null {
  for (const report of reports) {
    const picture = report.pictures.get(event.id);
    if (picture !== undefined) return picture;
  }
  return recordedId === null ? null : (station.store.event(recordedId)?.picture ?? null);
}
