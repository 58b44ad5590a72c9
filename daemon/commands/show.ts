import { eventSheet, historyLines } from '../../alerts/index.ts';
import type { EventRecord, OutboxRecord } from '../records.ts';
import { eventOf, withRecord } from './record.ts';
import { table } from './table.ts';
import { printJson, type Terminal } from './terminal.ts';

/** `show`: everything about one event. */
export async function show(
  terminal: Terminal,
  id: string,
  options: { readonly config: string; readonly json?: boolean },
): Promise<void> {
  await withRecord(options.config, (store, { mail }) => {
    const record = eventOf(store, id);
    const sent = store.outbox({ eventId: record.event.id });
    if (options.json) printJson(terminal, { ...record, mail: sent });
    else terminal.out(eventText(record, sent, mail.timezone));
  });
}

function eventText(record: EventRecord, sent: readonly OutboxRecord[], timezone: string): string {
  const { event } = record;
  const sheet = eventSheet(event, record.picture, timezone);
  const former = record.formerIds.length === 0 ? '' : ` (before: ${record.formerIds.join(', ')})`;
  const label = { title: '', text: (row: { label: string; value: string }) => row.label };
  const value = { title: '', text: (row: { label: string; value: string }) => row.value };
  return [
    sheet.title,
    `event ${event.id}, revision ${record.revision}${former}`,
    '',
    sheet.meaning,
    table(sheet.rows, [label, value], ''),
    '',
    ...lines(sheet.caution === '' ? [] : [sheet.caution]),
    ...titled('Check before accepting', sheet.check),
    ...titled('What to observe next', sheet.observe),
    ...titled('History', historyLines(record.history)),
    ...titled(
      'Verdicts',
      record.verdicts.map(({ at, verdict, by, note }) => `${at}  ${verdict} by ${by}${note === '' ? '' : `: ${note}`}`),
    ),
    ...titled(
      'Mail',
      sent.map(({ createdAt, recipient, state, subject }) => `${createdAt}  ${state}  ${recipient}  ${subject}`),
    ),
  ]
    .join('\n')
    .trimEnd();
}

function titled(title: string, items: readonly string[]): string[] {
  return items.length === 0 ? [] : [`${title}:`, ...items.map((item) => `  ${item}`), ''];
}

function lines(items: readonly string[]): string[] {
  return items.flatMap((item) => [item, '']);
}
