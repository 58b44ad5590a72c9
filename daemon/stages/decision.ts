import { combineSiteEvents } from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { Station } from '../station.ts';
import type { PulsarReportRow } from '../store/index.ts';

/** What is published, from what the detector says about each pulsar alone: a step that a whole site shows is one event, of the site. */
export function publishedEvents({ store }: Station, changed: readonly PulsarReportRow[]): readonly PulsarEvent[] {
  const own = new Map(store.pulsarReports().map((report) => [report.pulsar, report.events]));
  for (const report of changed) own.set(report.pulsar, report.events);
  const inOrder = [...own].sort(([a], [b]) => (a < b ? -1 : 1));
  return combineSiteEvents(inOrder.flatMap(([, events]) => events));
}

/** A report as the record keeps it. */
export function reportRow(station: Station, report: PulsarReport): PulsarReportRow {
  const model = station.configuration.models.get(report.pulsar);
  if (model === undefined) throw new Error(`${report.pulsar} has no model`);
  const { pulsar, events, locked, noise, lastArrivalMjd } = report;
  return { pulsar, basis: station.basisOf(model), events, locked, noise, lastArrivalMjd };
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
