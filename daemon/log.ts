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
  const { JOURNAL_STREAM } = process.env;
  const journal = options.journal ?? JOURNAL_STREAM !== undefined;
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

/** Goes on when nobody reads any more (a closed pipe, a full journal): the daemon's work is worth more than its log. */
function writeToStderr(): (line: string) => void {
  process.stderr.on('error', () => {});
  return (line) => {
    process.stderr.write(line);
  };
}
