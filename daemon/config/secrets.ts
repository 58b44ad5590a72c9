import { closeSync, constants, fstatSync, openSync, readSync } from 'node:fs';
import { dirname } from 'node:path';
import { inspect } from 'node:util';

/**
 * Passwords: read from a file that its owner alone can read, or from the environment, and carried in a wrapper that prints as
 * hidden wherever it ends up by mistake.
 */
export class Secret {
  readonly #value: string;

  constructor(value: string) {
    this.#value = value;
  }

  /** For the one place that hands it to the server. */
  reveal(): string {
    return this.#value;
  }

  toString(): string {
    return '(hidden)';
  }

  toJSON(): string {
    return '(hidden)';
  }

  [inspect.custom](): string {
    return '(hidden)';
  }
}

export type SecretResult = { readonly secret: Secret } | { readonly problem: string };

/** Where the mail password may stand when the configuration names no file. */
const PASSWORD_VARIABLE = 'SPINVIGIL_MAIL_PASSWORD';
const LONGEST_SECRET_BYTES = 4096;

/** Read anew at each login, so that a rotated password is picked up. `file` null: from the environment. */
export function readMailPassword(file: string | null, environment: NodeJS.ProcessEnv = process.env): SecretResult {
  if (file !== null) return readSecretFile(file);
  const value = environment[PASSWORD_VARIABLE];
  if (value === undefined || value === '') {
    return { problem: `no password: set password_file in [mail] or the environment variable ${PASSWORD_VARIABLE}` };
  }
  return { secret: new Secret(value) };
}

/** Refuses a file that does not hold one line, or that is not the owner's alone. The complaint says what to run. */
export function readSecretFile(file: string): SecretResult {
  const read = readPrivateFile(file, LONGEST_SECRET_BYTES);
  return 'problem' in read ? read : secretOf(read.bytes, file);
}

/** The bytes of a file that its owner alone can read; refuses links and anything that others could have read or written. */
export function readPrivateFile(
  file: string,
  longestBytes: number,
): { readonly bytes: Buffer } | { readonly problem: string } {
  let descriptor: number;
  try {
    descriptor = openSync(file, constants.O_RDONLY | constants.O_NOFOLLOW | constants.O_NONBLOCK | constants.O_NOCTTY);
  } catch (error) {
    return { problem: openingProblem(file, error as NodeJS.ErrnoException) };
  }
  try {
    const stat = fstatSync(descriptor);
    if (!stat.isFile()) return { problem: `${file} is not a regular file` };
    if ((stat.mode & (isCredential(file) ? 0o037 : 0o077)) !== 0) {
      return { problem: `${file} can be read or written by others than its owner; run: chmod 600 ${shellWord(file)}` };
    }
    const self = process.geteuid?.();
    if (self !== undefined && stat.uid !== self && stat.uid !== 0) {
      return { problem: `${file} belongs to another user; run: chown ${self} ${shellWord(file)}` };
    }
    const bytes = Buffer.alloc(longestBytes + 1);
    const read = bytes.subarray(0, readSync(descriptor, bytes, 0, bytes.length, 0));
    if (read.length > longestBytes)
      return { problem: `${file} holds more than ${longestBytes} bytes: not what belongs here` };
    return { bytes: read };
  } finally {
    closeSync(descriptor);
  }
}

/**
 * One that systemd hands over (LoadCredential). It grants the service's user reading by an access list, whose mask stat(2) shows as the
 * group's right (from memory, of systemd.exec(5) and acl(5)); the folder itself lets nobody else in.
 */
function isCredential(file: string): boolean {
  const { CREDENTIALS_DIRECTORY } = process.env;
  return CREDENTIALS_DIRECTORY !== undefined && dirname(file) === CREDENTIALS_DIRECTORY;
}

function secretOf(bytes: Buffer, file: string): SecretResult {
  const value = bytes.toString('utf8').replace(/\r?\n$/, '');
  if (value === '') return { problem: `${file} is empty; write the password on its first line` };
  // A tab or any other control character cannot have been meant either.
  if (/\p{Cc}/u.test(value))
    return { problem: `${file} holds more than one line or control characters; it must hold the password alone` };
  return { secret: new Secret(value) };
}

function openingProblem(file: string, error: NodeJS.ErrnoException): string {
  if (error.code === 'ELOOP') return `${file} is a symbolic link; name the file itself`;
  if (error.code === 'ENOENT') return `${file} does not exist`;
  if (error.code === 'EACCES')
    return `${file} cannot be read by this user; run: chown ${process.geteuid?.() ?? '$USER'} ${shellWord(file)}`;
  return `${file} cannot be opened (${error.code ?? error.message})`;
}

function shellWord(text: string): string {
  return /^[\w@%+=:,./-]+$/.test(text) ? text : `'${text.replaceAll("'", "'\\''")}'`;
}
