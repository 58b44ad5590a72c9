import { eventName, sizeText, subjectOf } from '../../alerts/index.ts';
import type { EventState } from '../../detectors/steps/pulsarEvent.ts';
import { mjdOf } from '../clock.ts';
import { EXIT, OperatorError } from '../errors.ts';
import type { ListedEvent } from '../records.ts';
import { requirePulsar, withRecord } from './record.ts';
import { table } from './table.ts';
import { printJson, type Terminal } from './terminal.ts';

export interface EventsOptions {
  readonly config: string;
  readonly since?: string;
  readonly pulsar?: string;
  readonly state?: EventState;
  readonly json?: boolean;
}

/** `events`: the event log, oldest first. */
export async function events(terminal: Terminal, options: EventsOptions): Promise<void> {
  const { since, pulsar, state } = options;
  const filter = {
    ...(since === undefined ? {} : { epochFromMjd: mjdFrom(since) }),
    ...(pulsar === undefined ? {} : { pulsar }),
    ...(state === undefined ? {} : { state }),
  };
  const listed = await withRecord(options.config, (store, { models }) => {
    if (pulsar !== undefined) requirePulsar(pulsar, [...models.keys(), ...store.pulsars()]);
    return store.events(filter);
  });
  if (options.json)
    printJson(
      terminal,
      listed.map(({ event }) => event),
    );
  else terminal.out(eventTable(listed));
}

export function eventTable(listed: readonly ListedEvent[]): string {
  return table(
    listed,
    [
      { title: 'event', text: ({ event }) => event.id },
      { title: 'pulsar', text: ({ event }) => subjectOf(event) },
      { title: 'what', text: ({ event }) => eventName(event) },
      { title: 'epoch MJD (TDB)', text: ({ event }) => event.epochMjd.toFixed(2), align: 'right' },
      { title: 'size', text: ({ event }) => sizeText(event) },
    ],
    'No events.',
  );
}

const ISO_DATE = /^\d{4}-\d{2}-\d{2}(T\d{2}:\d{2}(:\d{2}(\.\d+)?)?Z?)?$/;

/** A date of the calendar (UTC) or an MJD, as somebody typed it. */
export function mjdFrom(text: string): number {
  if (/^\d{4,6}(\.\d+)?$/.test(text)) return Number(text);
  const at = ISO_DATE.test(text) ? new Date(text.length === 10 || text.endsWith('Z') ? text : `${text}Z`) : null;
  if (at !== null && !Number.isNaN(at.getTime())) return mjdOf(at);
  throw new OperatorError(`“${text}” is neither a date such as 2026-03-29 nor an MJD such as 61128.5`, {
    exitCode: EXIT.wrongUsage,
  });
}
