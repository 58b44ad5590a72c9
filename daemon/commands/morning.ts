import { writeFile } from 'node:fs/promises';
import { digestHtml, digestText } from '../../alerts/index.ts';
import { systemClock } from '../clock.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { morningReview, tableWarnings } from '../morning.ts';
import { loadTables } from '../tables/loadTables.ts';
import { withRecord } from './record.ts';
import { printJson, type Terminal } from './terminal.ts';

export interface MorningOptions {
  readonly config: string;
  readonly date?: string;
  readonly html?: string;
  readonly json?: boolean;
}

/** `morning`: the review of a day, the same as the digest mail. */
export async function morning(terminal: Terminal, { config, date, html, json }: MorningOptions): Promise<void> {
  if (date !== undefined && !isCivilDate(date)) {
    throw new OperatorError(`“${date}” is not a date such as 2026-03-29`, { exitCode: EXIT.wrongUsage });
  }
  const clock = systemClock;
  const warnings = tableWarnings(loadTables(), clock.now());
  await withRecord(config, async (store, configuration) => {
    const review = morningReview({ configuration, store, clock, warnings }, date);
    const setting = { observatory: configuration.observatory, timezone: configuration.mail.timezone, reviewUrl: null };
    if (html !== undefined) {
      await writeFile(html, digestHtml(review, setting));
      terminal.err.write(`${html} written\n`);
    }
    if (json) printJson(terminal, review);
    else if (html === undefined) terminal.out(digestText(review, setting));
  });
}

function isCivilDate(text: string): boolean {
  if (!/^\d{4}-\d{2}-\d{2}$/.test(text)) return false;
  const at = new Date(`${text}T00:00:00Z`);
  return !Number.isNaN(at.getTime()) && at.toISOString().startsWith(text);
}
