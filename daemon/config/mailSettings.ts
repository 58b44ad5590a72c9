import type { z } from 'zod';
import { isLoopback } from '../loopback.ts';
import type { FolderTransport, MailSettings, SmtpTransport } from './configuration.ts';
import { readMailPassword } from './secrets.ts';
import type { SectionReader } from './sectionReader.ts';
import { mailTable } from './sections.ts';

type MailTable = z.output<typeof mailTable>;

/** Where files and variables named in `[mail]` are looked up. */
export interface Surroundings {
  /** Makes a path from the file absolute. */
  absolute(path: string): string;
  readonly environment: NodeJS.ProcessEnv;
}

const SMTP_KEYS = ['host', 'port', 'secure', 'user', 'password_file'] as const;
/** Registered ports: RFC 8314 (465), RFC 6409 (587), RFC 5321 (25). */
const USUAL_PORT = { tls: 465, starttls: 587, none: 25 } as const;

export function readMail(reader: SectionReader, around: Surroundings): MailSettings | null {
  const table = reader.read(['mail'], mailTable);
  if (table === null) return null;
  const twice = table.to.findIndex((address, index) => table.to.indexOf(address) < index);
  if (twice >= 0) reader.error(['mail', 'to', twice], `"${table.to[twice]}" stands there twice`);
  const transport =
    table.transport === 'smtp' ? smtpTransport(reader, table, around) : folderTransport(reader, table, around);
  if (transport === null || twice >= 0) return null;
  const { from, to, timezone, digest_cron: digestCron, historical_after_days: historicalAfterDays } = table;
  const updateWhenSharperBy = table.update_when_sharper_by;
  return { transport, from, to, timezone, digestCron, historicalAfterDays, updateWhenSharperBy };
}

function folderTransport(reader: SectionReader, table: MailTable, around: Surroundings): FolderTransport | null {
  const misplaced = SMTP_KEYS.filter((key) => table[key] !== undefined);
  for (const key of misplaced) reader.error(['mail', key], 'belongs to transport = "smtp"; this one is "folder"');
  if (table.folder === undefined) {
    reader.error(['mail', 'folder'], 'is missing: the folder that mail is written to');
    return null;
  }
  return misplaced.length > 0 ? null : { kind: 'folder', folder: around.absolute(table.folder) };
}

function smtpTransport(reader: SectionReader, table: MailTable, around: Surroundings): SmtpTransport | null {
  let sound = true;
  const fail = (key: string, message: string) => {
    reader.error(['mail', key], message);
    sound = false;
  };
  const { host, secure = 'tls', user = null } = table;
  const passwordFile = table.password_file === undefined ? null : around.absolute(table.password_file);
  if (table.folder !== undefined) fail('folder', 'belongs to transport = "folder"; this one is "smtp"');
  if (host === undefined) fail('host', 'is missing: the name of the mail server');
  else if (secure === 'none' && !isLoopback(host)) {
    fail(
      'secure',
      `"none" would send mail and password in the clear to ${host}; only a server on this machine may have it`,
    );
  }
  if (user !== null || passwordFile !== null) {
    if (user === null) fail('user', 'is missing: password_file without a user');
    const password = readMailPassword(passwordFile, around.environment);
    if ('problem' in password) fail(passwordFile === null ? 'user' : 'password_file', password.problem);
  }
  if (!sound || host === undefined) return null;
  return { kind: 'smtp', host, port: table.port ?? USUAL_PORT[secure], secure, user, passwordFile };
}
