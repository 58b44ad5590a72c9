import { fstatSync } from 'node:fs';
import { type Logger, pino } from 'pino';

/**
 * One JSON line per fact, on stderr. Under systemd each line carries its priority in front, as sd-daemon(3) has it, and the
 * journal keeps the time. Secrets never get here; should one stand in a logged object under its usual key, it is blanked.
 */
export type Log = Logger;

const SYSLOG_PRIORITY = new Map([
  [60, '<2>'],
  [50, '<3>'],
  [40, '<4>'],
  [30, '<6>'],
  [20, '<7>'],
  [10, '<7>'],
]);
const SECRET_KEYS = ['password', 'pass', 'secret', 'token', 'authorization', 'cookie'];
const LONGEST_FIELD = 2000;

export interface LogOptions {
  readonly level?: 'debug' | 'info' | 'warn' | 'error' | 'silent';
  /** Write syslog priorities in front of the lines, for the journal. */
  readonly journal?: boolean;
  readonly write?: (line: string) => void;
}

export function createLog(options: LogOptions = {}): Log {
  const write = options.write ?? writeToStderr();
  const journal = options.journal ?? goesToJournal();
  const destination = {
    lastLevel: 30,
    write(line: string) {
      write(journal ? `${SYSLOG_PRIORITY.get(this.lastLevel) ?? '<6>'}${line}` : line);
    },
    // pino hands the level of each line to a destination that carries this mark.
    [Symbol.for('pino.metadata')]: true,
  };
  return pino(
    {
      level: options.level ?? 'info',
      base: null,
      timestamp: () => (journal ? '' : `,"time":"${new Date().toISOString()}"`),
      formatters: { level: (label) => ({ level: label }), log: shorten },
      redact: { paths: SECRET_KEYS.flatMap((key) => [key, `*.${key}`, `*.*.${key}`]), censor: '(hidden)' },
    },
    destination,
  );
}

/** The device and inode that systemd names are those of our stderr: it may have been sent elsewhere since (systemd.exec(5)). */
function goesToJournal(): boolean {
  const { JOURNAL_STREAM } = process.env;
  if (JOURNAL_STREAM === undefined) return false;
  try {
    const { dev, ino } = fstatSync(STDERR, { bigint: true });
    return JOURNAL_STREAM === `${dev}:${ino}`;
  } catch {
    return false;
  }
}

const STDERR = 2;

/** A log that says nothing, for one-off commands and tests. */
export const silentLog = (): Log => createLog({ level: 'silent', write: () => {} });

function shorten(fields: Record<string, unknown>): Record<string, unknown> {
  return Object.fromEntries(
    Object.entries(fields).map(([key, value]) => [
      key,
      typeof value === 'string' && value.length > LONGEST_FIELD ? `${value.slice(0, LONGEST_FIELD)}… (cut)` : value,
    ]),
  );
}

/** A reader that is slow holds back so much and no more. */
const MOST_HELD_BACK_BYTES = 4 * 1024 * 1024;
let dropped = 0;

/** Lines that nobody took since the program started. */
export function droppedLogLines(): number {
  return dropped;
}

/** Goes on when nobody reads any more (a closed pipe, a full journal): the daemon's work is worth more than its log. */
function writeToStderr(): (line: string) => void {
  process.stderr.on('error', () => {
    dropped += 1;
  });
  return (line) => {
    if (process.stderr.writableLength > MOST_HELD_BACK_BYTES) dropped += 1;
    else process.stderr.write(line);
  };
}
