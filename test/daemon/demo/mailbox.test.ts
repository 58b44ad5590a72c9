import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { newMail } from '../../../daemon/demo/mailbox.ts';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'spinvigil-mailbox-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const put = (name: string, ...head: string[]) =>
  writeFileSync(join(folder, name), `${head.join('\r\n')}\r\n\r\nSubject: body\r\n`);

test('each message is told once, whoever else it went to', () => {
  const told = newMail(folder);
  expect(told()).toEqual([]);
  put('1-a.eml', 'Message-ID: <1@x>', 'Subject: one');
  put('1-b.eml', 'Message-ID: <1@x>', 'Subject: one');
  put('2-a.eml', 'Subject: two', 'Message-ID: <2@x>');
  put('.3-a.eml.tmp', 'Subject: not there yet');
  expect(told()).toEqual(['one', 'two']);
  expect(told()).toEqual([]);
});

test('a folder that is not there yet holds no mail', () => {
  expect(newMail(join(folder, 'later'))()).toEqual([]);
});

// The encoded words are the examples of RFC 2047 §8 and §4, in UTF-8.
test.each([
  ['=?UTF-8?Q?a?=', 'a'],
  ['=?utf-8?q?a?= b', 'a b'],
  ['=?UTF-8?Q?a?= =?UTF-8?Q?b?=', 'ab'],
  ['=?UTF-8?Q?a?=\r\n   =?UTF-8?Q?b?=', 'ab'],
  ['=?UTF-8?Q?a_b?=', 'a b'],
  ['=?UTF-8?B?zpTOvS/OvQ==?= 3.1e-9', 'Δν/ν 3.1e-9'],
  ['=?UTF-8?Q?=CE=94=CE=BD=2F=CE=BD?=', 'Δν/ν'],
])('subject %j reads %j', (written, read) => {
  put('1.eml', `Subject: ${written}`, 'Message-ID: <1@x>');
  expect(newMail(folder)()).toEqual([read]);
});
