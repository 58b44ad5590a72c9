import { chmodSync, mkdtempSync, readFileSync, rmSync, statSync, symlinkSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import {
  hashPassword,
  isPassword,
  passwordProblem,
  readPasswordFile,
  writePasswordEntry,
} from '../../../../daemon/review/access/passwords.ts';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'spinvigil-passwords-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const base64url = (hexadecimal: string) => Buffer.from(hexadecimal.replace(/\s/g, ''), 'hex').toString('base64url');

describe('a hashed password', () => {
  // RFC 7914, section 12, the vectors with N = 1024 and N = 16384.
  test.each([
    {
      password: 'password',
      salt: 'NaCl',
      ...{ cost: 1024, blockSize: 8, parallelism: 16 },
      hash: `fdbabe1c9d3472007856e7190d01e9fe7c6ad7cbc8237830e77376634b373162
             2eaf30d92e22a3886ff109279d9830dac727afb94a83ee6d8360cbdfa2cc0640`,
    },
    {
      password: 'pleaseletmein',
      salt: 'SodiumChloride',
      ...{ cost: 16384, blockSize: 8, parallelism: 1 },
      hash: `7023bdcb3afd7348461c06cd81fd38ebfda8fbba904f8e3ea9b543f6545da1f2
             d5432955613f0fcf62d49705242a9af9e61e85dc0d651e40dfcf017b45575887`,
    },
  ])('is what RFC 7914 says of “$password”', async ({ password, salt, hash, ...parameters }) => {
    const stored = { ...parameters, salt: Buffer.from(salt).toString('base64url'), hash: base64url(hash) };
    expect(await isPassword(password, stored)).toBe(true);
    expect(await isPassword(`${password} `, stored)).toBe(false);
  });

  test('has a salt of its own, and knows the same letters in another writing', async () => {
    const [one, other] = [await hashPassword('naïve résumé!'), await hashPassword('naïve résumé!')];
    expect(one.hash).not.toBe(other.hash);
    expect(await isPassword('naïve résumé!'.normalize('NFD'), one)).toBe(true);
    expect(await isPassword('naive resume!', one)).toBe(false);
  });
});

test.each([
  ['short', 'the password has 5 characters; give 12 at least'],
  ['x'.repeat(201), 'the password has 201 characters; at most 200 are taken'],
  ['tab\tin between', 'the password holds a control character'],
  ['correct horse battery', null],
])('of %s: %s', (password, problem) => expect(passwordProblem(password)).toBe(problem));

describe('the password file', () => {
  const file = () => join(folder, 'reviewers.json');

  test('appears for its owner alone, holds no password, and is changed entry by entry', async () => {
    expect(readPasswordFile(file())).toEqual({ entries: [] });
    writePasswordEntry(file(), 'duty', await hashPassword('correct horse battery'));
    writePasswordEntry(file(), '__proto__', await hashPassword('another long one'));
    expect(statSync(file()).mode & 0o777).toBe(0o600);
    expect(readFileSync(file(), 'utf8')).not.toContain('correct horse');
    const read = readPasswordFile(file());
    expect('entries' in read && read.entries.map(({ name }) => name)).toEqual(['duty', '__proto__']);
    writePasswordEntry(file(), 'duty', null);
    expect(readPasswordFile(file())).toMatchObject({ entries: [{ name: '__proto__' }] });
  });

  test('F-1: of others, a link, or of another make is refused with what to run, and not written over', async () => {
    const password = await hashPassword('correct horse battery');
    writePasswordEntry(file(), 'duty', password);
    chmodSync(file(), 0o644);
    expect(readPasswordFile(file())).toEqual({ problem: expect.stringContaining(`chmod 600 ${file()}`) });
    expect(writePasswordEntry(file(), 'duty', null)).toEqual({ problem: expect.stringContaining('chmod 600') });
    chmodSync(file(), 0o600);
    expect(readPasswordFile(file())).toMatchObject({ entries: [{ name: 'duty' }] });

    symlinkSync(file(), join(folder, 'link'));
    expect(readPasswordFile(join(folder, 'link'))).toEqual({ problem: expect.stringContaining('symbolic link') });
    for (const text of ['', '{}', '[{"name":"duty"}]', 'not json']) {
      writeFileSync(file(), text);
      expect(readPasswordFile(file())).toEqual({ problem: expect.stringContaining('is not a password file') });
    }
  });
});
