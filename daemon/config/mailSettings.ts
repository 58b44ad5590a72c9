import type { z } from 'zod';
import { isLoopback } from '../loopback.ts';
import type { AlsoTo, FolderTransport, MailSettings, SmtpTransport } from './configuration.ts';
import { readMailPassword } from './secrets.ts';
import type { SectionReader } from './sectionReader.ts';
import { alsoToTable, mailTable } from './sections.ts';

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
  const quietHours = quietHoursOf(reader, table);
  const alsoTo = readAlsoTo(reader);
  if (transport === null || twice >= 0) return null;
  const { from, to, timezone, digest_cron: digestCron, historical_after_days: historicalAfterDays } = table;
  const updateWhenSharperBy = table.update_when_sharper_by;
  const { mail_suspected: mailSuspected, most_per_hour: mostPerHour } = table;
  const when = {
    timezone,
    digestCron,
    historicalAfterDays,
    updateWhenSharperBy,
    mailSuspected,
    quietHours,
    mostPerHour,
  };
  return { transport, from, to, alsoTo, ...when };
}

function quietHoursOf(reader: SectionReader, table: MailTable): MailSettings['quietHours'] {
  const { quiet_hours: hours, quiet_hours_except_above: exceptAbove = null } = table;
  if (hours !== undefined) {
    const [from = '', until = ''] = hours.split('-');
    return { from, until, exceptAbove };
  }
  if (exceptAbove !== null) reader.error(['mail', 'quiet_hours_except_above'], 'needs quiet_hours beside it');
  return null;
}

function readAlsoTo(reader: SectionReader): AlsoTo[] {
  return reader.tablesOf(['mail', 'also_to']).flatMap((path) => {
    const table = reader.read(path, alsoToTable);
    if (table === null) return [];
    if (table.explanations.length === 0 && table.pulsars.length === 0) {
      reader.error(path, 'says of what: explanations, pulsars or both; who wants everything belongs into [mail] to');
    }
    return [table];
  });
}

/** A pulsar that has no model would never be mailed about: most likely its name is misspelt. */
export function checkNamedPulsars(
  reader: SectionReader,
  mail: MailSettings | null,
  models: Pick<ReadonlyMap<string, unknown>, 'has'> | null,
): void {
  for (const [i, { pulsars }] of (mail?.alsoTo ?? []).entries()) {
    for (const [j, pulsar] of pulsars.entries()) {
      if (models !== null && !models.has(pulsar)) {
        reader.warning(['mail', 'also_to', i, 'pulsars', j], `"${pulsar}" has no model`);
      }
    }
  }
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
