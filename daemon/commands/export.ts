import { eventJson, eventsCsv, voevent } from '../../alerts/index.ts';
import { systemClock } from '../clock.ts';
import { citedRevision } from '../stages/told.ts';
import type { NoticeForm } from './choices.ts';
import { eventOf, withRecord } from './record.ts';
import type { Terminal } from './terminal.ts';

/** `export`: one event as a notice for others. */
export async function exportEvent(
  terminal: Terminal,
  id: string,
  options: { readonly config: string; readonly as: NoticeForm },
): Promise<void> {
  await withRecord(options.config, (store, { observatory, models }) => {
    const { event, revision } = eventOf(store, id);
    if (options.as === 'json') terminal.out(eventJson(event));
    else if (options.as === 'csv') terminal.out(eventsCsv([event]));
    else {
      const model = event.site === null ? (models.get(event.pulsar) ?? null) : null;
      const issuedAt = systemClock.now();
      const cites = citedRevision({ store }, event.id, revision);
      terminal.out(voevent(event, { observatory, model, revision, issuedAt, cites, drill: false }));
    }
  });
}
