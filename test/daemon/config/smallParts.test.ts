import { chmodSync, chownSync, symlinkSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { inspect } from 'node:util';
import fc from 'fast-check';
import { validate } from 'node-cron';
import { describe, expect, it } from 'vitest';
import { closestName, editDistance } from '../../../daemon/closestName.ts';
import { cronProblem } from '../../../daemon/config/cronText.ts';
import { readMailPassword, readSecretFile, Secret } from '../../../daemon/config/secrets.ts';
import { isFault, parseToml } from '../../../daemon/config/tomlDocument.ts';
import { quoted, visibleText } from '../../../daemon/visibleText.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();

describe('the closest name', () => {
  // kitten → sitting is the usual worked example of the Levenshtein distance (common practice, no source).
  it.each([
    ['kitten', 'sitting', 3],
    ['', 'abc', 3],
    ['same', 'same', 0],
  ])('%s → %s', (from, to, distance) => expect(editDistance(from, to)).toBe(distance));

  it('is none where nothing is near', () => {
    expect(closestName('fodler', ['name', 'folder'])).toBe('folder');
    expect(closestName('epoch', ['name', 'epoch_mjd'])).toBe('epoch_mjd');
    expect(closestName('zzzzzzzz', ['name', 'folder'])).toBeNull();
  });
});

describe('a schedule', () => {
  it.each(['0 8 * * *', '*/15 0-6 1,15 jan-mar mon-fri', '59 23 31 12 7', '0-30/10 * * * 0', ' 0  8 * * * '])(
    '%s is sound',
    (text) => {
      expect(cronProblem(text)).toBeNull();
      expect(validate(text.trim())).toBe(true);
    },
  );

  it.each([
    '',
    '0 8 * *',
    '0 0 8 * * *',
    '60 8 * * *',
    '0 24 * * *',
    '0 8 0 * *',
    '0 8 * 13 *',
    '0 8 * * 8',
    '5/2 8 * * *',
    '9-5 8 * * *',
    '*/0 8 * * *',
    '@daily',
    'x 8 * * *',
    '1, 8 * * *',
    '-1 8 * * *',
  ])('%s is not', (text) => expect(cronProblem(text)).not.toBeNull());

  it('is never sound here and refused by the scheduler that runs it', () => {
    const item = (low: number, high: number) =>
      fc.oneof(
        fc.constant('*'),
        fc.integer({ min: low, max: high + 1 }).map(String),
        fc.tuple(fc.integer({ min: low, max: high }), fc.integer({ min: low, max: high })).map(([a, b]) => `${a}-${b}`),
        fc.integer({ min: 0, max: 99 }).map((step) => `*/${step}`),
      );
    const field = (low: number, high: number) =>
      fc.array(item(low, high), { minLength: 1, maxLength: 3 }).map((items) => items.join(','));
    const schedule = fc
      .tuple(field(0, 59), field(0, 23), field(1, 31), field(1, 12), field(0, 7))
      .map((fields) => fields.join(' '));
    let sound = 0;
    fc.assert(
      fc.property(schedule, (text) => {
        if (cronProblem(text) !== null) return;
        sound += 1;
        expect(validate(text), text).toBe(true);
      }),
      { numRuns: 1000, seed: 7 },
    );
    expect(sound).toBeGreaterThan(50);
  });
});

describe('a secret', () => {
  it('F-3 prints as hidden wherever it ends up', () => {
    const secret = new Secret('canary-4711');
    const printed = [
      String(secret),
      JSON.stringify({ secret }),
      inspect({ secret }, { depth: 9, showHidden: true }),
      `${secret}`,
    ];
    for (const text of printed) {
      expect(text).not.toContain('canary');
      expect(text).toContain('(hidden)');
    }
    expect(secret.reveal()).toBe('canary-4711');
  });

  function secretFile(content: string | Buffer, mode = 0o600): string {
    const file = join(newFolder(), 'secret');
    writeFileSync(file, content);
    chmodSync(file, mode);
    return file;
  }
  const reveal = (file: string) => {
    const result = readSecretFile(file);
    return 'secret' in result ? result.secret.reveal() : result.problem.replaceAll(file, 'FILE');
  };

  it('F-1 loses one line end and nothing else', () => {
    expect(reveal(secretFile('word'))).toBe('word');
    expect(reveal(secretFile(' pass word \n'))).toBe(' pass word ');
    expect(reveal(secretFile('word\r\n', 0o400))).toBe('word');
  });

  it.each([
    [0o644, 'FILE can be read or written by others than its owner; run: chmod 600 FILE'],
    [0o640, 'FILE can be read or written by others than its owner; run: chmod 600 FILE'],
    [0o602, 'FILE can be read or written by others than its owner; run: chmod 600 FILE'],
  ])('F-1 refuses mode %o', (mode, problem) => expect(reveal(secretFile('word', mode))).toBe(problem));

  it('F-1 refuses what is empty, long, of several lines, a link or no file', () => {
    expect(reveal(secretFile(''))).toContain('is empty');
    expect(reveal(secretFile('\n'))).toContain('is empty');
    expect(reveal(secretFile('x'.repeat(4097)))).toContain('more than 4096 bytes');
    expect(reveal(secretFile('one\ntwo\n'))).toContain('more than one line');
    expect(reveal(secretFile('one\n\n'))).toContain('more than one line');
    const folder = newFolder();
    symlinkSync(secretFile('word'), join(folder, 'link'));
    expect(reveal(join(folder, 'link'))).toBe('FILE is a symbolic link; name the file itself');
    expect(reveal(join(folder, 'none'))).toBe('FILE does not exist');
    expect(reveal(folder)).toBe('FILE is not a regular file');
  });

  it.runIf(process.geteuid?.() === 0)('F-1 refuses a file of another user', () => {
    const file = secretFile('word');
    chownSync(file, 65_534, 65_534);
    expect(reveal(file)).toBe('FILE belongs to another user; run: chown 0 FILE');
  });

  it('comes from the environment when no file is named', () => {
    const result = readMailPassword(null, { SPINVIGIL_MAIL_PASSWORD: 'word' });
    expect('secret' in result && result.secret.reveal()).toBe('word');
    expect(readMailPassword(null, {})).toMatchObject({ problem: expect.stringContaining('SPINVIGIL_MAIL_PASSWORD') });
  });
});

describe('TOML with places', () => {
  it('gives the values, the places and the texts of numbers', () => {
    const document = parseToml('a.b = 1\n[c]\nd = [1.50, {e = "x"}]\n[[f]]\ng = 0x10\n[[f]]\n  g = true\n');
    if (isFault(document)) throw new Error(document.message);
    expect(JSON.parse(JSON.stringify(document.root))).toEqual({
      a: { b: 1 },
      c: { d: [1.5, { e: 'x' }] },
      f: [{ g: 16 }, { g: true }],
    });
    expect(document.placeOf(['f', 1, 'g'])).toEqual({ line: 7, column: 3 });
    expect(document.placeOf(['c', 'd', 1, 'e'])).toEqual({ line: 3, column: 13 });
    expect(document.placeOf(['f', 0, 'missing'])).toEqual({ line: 4, column: 3 });
    expect([
      document.textOf(['c', 'd', 0]),
      document.textOf(['c', 'd', 1, 'e']),
      document.textOf(['f', 1, 'g']),
    ]).toEqual(['1.50', 'x', null]);
  });
});

describe('visible text', () => {
  it('F-4 shows what is hidden, and cuts what is long', () => {
    expect(visibleText('a\u001b[31m\u2028\u202e\\')).toBe('a\\u{1b}[31m\\u{2028}\\u{202e}\\\\');
    expect(quoted('x'.repeat(100))).toBe(`"${'x'.repeat(60)}…"`);
  });
});
