import { mkdtempSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { createMailer } from '../../alerts/index.ts';

let folder = '';
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'spinvigil-mail-'));
});
afterEach(() => rmSync(folder, { recursive: true }));

const mime = (id: string, body = 'x') =>
  Buffer.from(`Subject: x\r\nMessage-ID:\r\n ${id}\r\nDate: Sun, 02 Jul 2023 03:10:00 +0000\r\n\r\n${body}\r\n`);
const send = (recipient: string, bytes: Buffer, to = folder) =>
  createMailer({ kind: 'folder', folder: to }, { password: () => null }).send({
    from: 'w@k.example',
    recipient,
    mime: bytes,
  });

describe('mail into a folder', () => {
  it('writes the very bytes, for the owner alone, under a name in order of time', async () => {
    expect((await send('a@k.example', mime('<1@k>'))).state).toBe('delivered');
    const [name = ''] = readdirSync(folder);
    expect(name).toMatch(/^20230702T031000Z-[0-9a-f]{16}\.eml$/);
    expect(readFileSync(join(folder, name)).equals(mime('<1@k>'))).toBe(true);
    expect(statSync(join(folder, name)).mode & 0o777).toBe(0o600);
  });

  it('one file a message and recipient, however often it is delivered', async () => {
    for (const recipient of ['a@k.example', 'b@k.example', 'a@k.example']) await send(recipient, mime('<1@k>'));
    await send('a@k.example', mime('<2@k>'));
    await send('a@k.example', mime('<2@k>', 'marked copy'));
    const files = readdirSync(folder);
    expect(files).toHaveLength(3);
    expect(files.filter((f) => readFileSync(join(folder, f), 'utf8').includes('marked copy'))).toHaveLength(1);
  });

  it('makes the folder, and says "later" where it cannot', async () => {
    expect((await send('a@k.example', mime('<1@k>'), join(folder, 'new', 'one'))).state).toBe('delivered');
    writeFileSync(join(folder, 'file'), '');
    expect(await send('a@k.example', mime('<1@k>'), join(folder, 'file'))).toMatchObject({ state: 'later' });
    const verify = (to: string) => createMailer({ kind: 'folder', folder: to }, { password: () => null }).verify();
    expect((await verify(folder)).state).toBe('delivered');
    expect((await verify(join(folder, 'file'))).state).toBe('later');
  });
});
