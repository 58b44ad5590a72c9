import { randomBytes, scrypt, timingSafeEqual } from 'node:crypto';
import {
  chownSync,
  closeSync,
  existsSync,
  fsyncSync,
  mkdirSync,
  openSync,
  renameSync,
  rmSync,
  statSync,
  writeSync,
} from 'node:fs';
import { dirname } from 'node:path';
import { z } from 'zod';
import { readPrivateFile } from '../../config/secrets.ts';

/**
 * The reviewers' passwords, hashed with scrypt (RFC 7914), in one file that its owner alone can read. The parameters stand beside each hash,
 * so that they can grow without anybody setting a password anew.
 */
export interface HashedPassword {
  /** CPU and memory cost N, a power of two. */
  readonly cost: number;
  readonly blockSize: number;
  readonly parallelism: number;
  /** base64url */
  readonly salt: string;
  readonly hash: string;
}

export interface PasswordEntry extends HashedPassword {
  readonly name: string;
}

/** 32 MiB and about a quarter of a second; one of the settings of equal strength in OWASP's Password Storage Cheat Sheet (from memory). */
const PARAMETERS = { cost: 2 ** 15, blockSize: 8, parallelism: 3 } as const;
const SALT_BYTES = 16;
const HASH_BYTES = 32;
const LARGEST_FILE_BYTES = 1024 * 1024;

export const SHORTEST_PASSWORD = 12;
const LONGEST_PASSWORD = 200;

const base64url = z.string().regex(/^[A-Za-z0-9_-]{16,200}$/);
const passwordFile = z.array(
  z.strictObject({
    name: z.string(),
    cost: z
      .int()
      .min(2)
      .max(2 ** 20),
    blockSize: z.int().min(1).max(32),
    parallelism: z.int().min(1).max(16),
    salt: base64url,
    hash: base64url,
  }),
);

/** What keeps a text from being a password; null: nothing. Length alone is asked for: rules about characters make worse ones (NIST SP 800-63B). */
export function passwordProblem(password: string): string | null {
  const length = [...password].length;
  if (length < SHORTEST_PASSWORD) return `the password has ${length} characters; give ${SHORTEST_PASSWORD} at least`;
  if (length > LONGEST_PASSWORD) return `the password has ${length} characters; at most ${LONGEST_PASSWORD} are taken`;
  return /\p{Cc}/u.test(password) ? 'the password holds a control character' : null;
}

export async function hashPassword(
  password: string,
  parameters: Omit<HashedPassword, 'salt' | 'hash'> = PARAMETERS,
): Promise<HashedPassword> {
  const salt = randomBytes(SALT_BYTES);
  const hash = await derive(password, { ...parameters, salt, bytes: HASH_BYTES });
  return { ...parameters, salt: salt.toString('base64url'), hash: hash.toString('base64url') };
}

/** Takes as long for a wrong password as for the right one. */
export async function isPassword(password: string, stored: HashedPassword): Promise<boolean> {
  const wanted = Buffer.from(stored.hash, 'base64url');
  const salt = Buffer.from(stored.salt, 'base64url');
  const given = await derive(password, { ...stored, salt, bytes: wanted.length });
  return timingSafeEqual(given, wanted);
}

/** Nobody's: compared with when the name is unknown, so that the answer takes as long. */
export const NOBODYS_PASSWORD: HashedPassword = {
  ...PARAMETERS,
  salt: Buffer.alloc(SALT_BYTES).toString('base64url'),
  hash: Buffer.alloc(HASH_BYTES).toString('base64url'),
};

interface Derivation extends Pick<HashedPassword, 'cost' | 'blockSize' | 'parallelism'> {
  readonly salt: Buffer;
  readonly bytes: number;
}

function derive(password: string, { cost, blockSize, parallelism, salt, bytes }: Derivation): Promise<Buffer> {
  const options = { N: cost, r: blockSize, p: parallelism, maxmem: 128 * cost * blockSize + 2 ** 22 * parallelism };
  return new Promise((resolve, reject) =>
    // The same letters typed on another keyboard are the same password (RFC 8265, normalisation C).
    scrypt(password.normalize('NFC'), salt, bytes, options, (error, key) => (error ? reject(error) : resolve(key))),
  );
}

export type PasswordFile = { readonly entries: readonly PasswordEntry[] } | { readonly problem: string };

/** A file that is not there holds nobody's. */
export function readPasswordFile(file: string): PasswordFile {
  if (!existsSync(file)) return { entries: [] };
  const read = readPrivateFile(file, LARGEST_FILE_BYTES);
  if ('problem' in read) return read;
  try {
    return { entries: passwordFile.parse(JSON.parse(read.bytes.toString('utf8'))) };
  } catch {
    return { problem: `${file} is not a password file of this program; remove it and set the passwords anew` };
  }
}

/** Sets the password of one reviewer, or takes it away. The file appears whole or not at all; throws when it cannot be written. */
export function writePasswordEntry(
  file: string,
  name: string,
  password: HashedPassword | null,
): { readonly problem: string } | null {
  const read = readPasswordFile(file);
  if ('problem' in read) return read;
  const others = read.entries.filter((entry) => entry.name !== name);
  const entries = password === null ? others : [...others, { name, ...password }];
  mkdirSync(dirname(file), { recursive: true, mode: 0o700 });
  const partial = `${file}.partial`;
  rmSync(partial, { force: true });
  const descriptor = openSync(partial, 'wx', 0o600);
  try {
    writeSync(descriptor, `${JSON.stringify(entries, null, 2)}\n`);
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
  giveToOwnerOf(dirname(file), partial);
  renameSync(partial, file);
  return null;
}

/** An administrator may set a password for a daemon that runs as another user. */
function giveToOwnerOf(folder: string, file: string): void {
  if (process.geteuid?.() !== 0) return;
  const { uid, gid } = statSync(folder);
  chownSync(file, uid, gid);
}
