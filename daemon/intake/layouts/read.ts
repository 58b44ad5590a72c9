import type { LeapSecondTable } from '../../../detectors/time/leapSeconds.ts';
import type { ArrivalFile } from '../rows.ts';
import { readColumns } from './columns.ts';
import { readCsv } from './csv.ts';
import { readFits } from './fits.ts';
import type { TextColumns } from './textColumns.ts';
import { readVotable } from './votable.ts';

export const LAYOUTS = ['csv', 'fits', 'votable', 'columns'] as const;

/** How a feed's files are built. */
export interface Layout {
  readonly layout: (typeof LAYOUTS)[number];
  /** In layout `columns`; null in the others. */
  readonly columns: TextColumns | null;
}

/** What a reader needs to know besides the bytes. */
export interface Reading {
  /** Of the file, in its feed's folder: a layout may take the pulsar from its name. */
  readonly path: string;
  /** A time of day becomes a part of its day, and a day with a leap second is longer. */
  readonly leapSeconds: LeapSecondTable;
}

/** Reads an arrival file of any layout. Never throws, whatever the bytes. */
export function readArrivalFile(bytes: Buffer, { layout, columns }: Layout, reading: Reading): ArrivalFile {
  if (columns !== null) return readColumns(bytes, columns, reading);
  if (layout === 'fits') return readFits(bytes);
  return layout === 'votable' ? readVotable(bytes) : readCsv(bytes);
}
