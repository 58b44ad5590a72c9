import type { SectionReader } from './sectionReader.ts';
import { heartbeatTable } from './sections.ts';

/** Where the watch says that it is alive, to somebody who notices when it does not say so any more. */
export interface HeartbeatSettings {
  readonly web: WebHeartbeat | null;
  readonly mail: MailHeartbeat | null;
}

export interface WebHeartbeat {
  readonly url: string;
  /** Fetched in its place while mail does not leave; null: nothing is fetched then. */
  readonly mailBlockedUrl: string | null;
  readonly everyMinutes: number;
}

export interface MailHeartbeat {
  readonly to: readonly string[];
  readonly everyHours: number;
}

/** Null after a complaint; no section: no heartbeat. */
export function readHeartbeat(reader: SectionReader): HeartbeatSettings | null {
  if (!reader.has(['heartbeat'])) return { web: null, mail: null };
  const table = reader.read(['heartbeat'], heartbeatTable);
  if (table === null) return null;
  const { url, mail_blocked_url: mailBlockedUrl = null, mail_to: to } = table;
  if (url === undefined && mailBlockedUrl !== null) {
    reader.error(['heartbeat', 'mail_blocked_url'], 'goes with url, which is missing');
  }
  if (url === undefined && to === undefined) {
    reader.error(['heartbeat'], 'says neither url nor mail_to: nobody would notice that it stops');
  }
  return {
    web: url === undefined ? null : { url, mailBlockedUrl, everyMinutes: table.every_minutes },
    mail: to === undefined ? null : { to, everyHours: table.mail_every_hours },
  };
}
