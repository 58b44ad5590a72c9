import { execFileSync } from 'node:child_process';
import {
  appendFileSync,
  chmodSync,
  closeSync,
  linkSync,
  mkdirSync,
  openSync,
  renameSync,
  rmSync,
  symlinkSync,
  truncateSync,
  writeFileSync,
} from 'node:fs';
import { lstat } from 'node:fs/promises';
import { createServer } from 'node:net';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { type Reading, readStill } from '../../../daemon/watch/open.ts';
import { type FoundFile, type Scan, scanFolder } from '../../../daemon/watch/scan.ts';
import { stampOf } from '../../../daemon/watch/signature.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';
import { withoutRights } from '../../support/withoutRights.ts';

const newFolder = useTemporaryFolders();

async function listed(folder: string, recursive = true): Promise<Extract<Scan, { kind: 'listed' }>> {
  const scan = await scanFolder(folder, { recursive });
  if (scan.kind !== 'listed') throw new Error(scan.reason);
  return scan;
}

function readFound(scan: Extract<Scan, { kind: 'listed' }>, file: FoundFile, limit = {}): Promise<Reading> {
  return readStill({ root: scan.root, pathBytes: file.pathBytes, signature: file.stamp.signature }, limit);
}

/** As it would be read when a scan had seen it. */
async function readPath(folder: string, name: string): Promise<Reading> {
  const found = await lstat(join(folder, name), { bigint: true });
  return readStill({ root: Buffer.from(folder), pathBytes: Buffer.from(name), signature: stampOf(found).signature });
}

describe('a scan', () => {
  it('lists regular files, in subfolders only where wanted', async () => {
    const folder = newFolder();
    mkdirSync(join(folder, 'sub', 'deep'), { recursive: true });
    for (const name of ['a.csv', '.hidden', 'b.tmp', 'sub/c.csv', 'sub/deep/d.csv'])
      writeFileSync(join(folder, name), 'x');
    expect((await listed(folder)).files.map(({ path }) => path).sort()).toEqual([
      'a.csv',
      'sub/c.csv',
      'sub/deep/d.csv',
    ]);
    expect((await listed(folder, false)).files.map(({ path }) => path)).toEqual(['a.csv']);
  });

  it('A26 lists and reads any name that a file can have', async () => {
    const folder = newFolder();
    const names = [
      '__proto__',
      'constructor',
      '<img onerror=x>',
      'new\nline',
      '=cmd',
      'r\u202etl',
      'x'.repeat(255),
    ].map((name) => Buffer.from(name));
    names.push(Buffer.from([0x6b, 0xff, 0x2e, 0x63]));
    for (const name of names) writeFileSync(Buffer.concat([Buffer.from(`${folder}/`), name]), name);
    const scan = await listed(folder);
    expect(scan.files).toHaveLength(names.length);
    for (const file of scan.files) expect(await readFound(scan, file)).toEqual({ kind: 'read', bytes: file.pathBytes });
  });

  it('A27 names links and never follows them, not to folders either', async () => {
    const [folder, outside] = [newFolder(), newFolder()];
    writeFileSync(join(outside, 'secret.csv'), 'secret');
    symlinkSync(join(outside, 'secret.csv'), join(folder, 'link.csv'));
    symlinkSync(outside, join(folder, 'linked folder'));
    symlinkSync('loop', join(folder, 'loop'));
    symlinkSync('nowhere', join(folder, 'dangling'));
    const scan = await listed(folder);
    expect(scan.files).toEqual([]);
    expect(scan.refused.map(({ path }) => path).sort()).toEqual(['dangling', 'link.csv', 'linked folder', 'loop']);
    expect(new Set(scan.refused.map(({ reason }) => reason))).toEqual(
      new Set(['is a symbolic link; links are not followed']),
    );
    expect(await readPath(folder, 'link.csv')).toEqual({
      kind: 'refused',
      reason: 'is a symbolic link; links are not followed',
    });
  });

  it('A29 names pipes and sockets by their kind, and does not hang on them', async () => {
    const folder = newFolder();
    execFileSync('mkfifo', [join(folder, 'pipe.csv')]);
    mkdirSync(join(folder, 'folder.csv'));
    const server = createServer();
    await new Promise<void>((resolve) => server.listen(join(folder, 'socket.csv'), resolve));
    const scan = await listed(folder);
    expect(scan.files).toEqual([]);
    expect(scan.refused.map(({ path, reason }) => `${path} ${reason}`).sort()).toEqual([
      'pipe.csv is a named pipe, not a file',
      'socket.csv is a socket, not a file',
    ]);
    // Five at once would use up the thread pool of the process, did they block.
    const readings = await Promise.all(Array.from({ length: 5 }, () => readPath(folder, 'pipe.csv')));
    for (const reading of readings) expect(reading).toEqual({ kind: 'refused', reason: 'is a named pipe, not a file' });
    expect(await readPath(folder, 'socket.csv')).toMatchObject({ kind: 'refused' });
    expect(await readPath(folder, 'folder.csv')).toEqual({ kind: 'refused', reason: 'is a folder' });
    await new Promise((resolve) => server.close(resolve));
  });

  it('A30 refuses devices without end, and does not believe files whose length is a lie', async () => {
    expect(await readPath('/dev', 'zero')).toEqual({ kind: 'refused', reason: 'is a device, not a file' });
    expect(await readPath('/proc', 'version')).toMatchObject({ kind: 'later' });
  });

  it('A31 names a folder and a file that it may not read, and reads them when it may', async () => {
    const folder = newFolder();
    chmodSync(folder, 0o755);
    mkdirSync(join(folder, 'closed'));
    writeFileSync(join(folder, 'a.csv'), 'x');
    chmodSync(join(folder, 'closed'), 0);
    chmodSync(join(folder, 'a.csv'), 0);
    await withoutRights(async () => {
      const scan = await listed(folder);
      expect(scan.refused).toMatchObject([
        { path: 'closed', reason: 'folder cannot be read by this user (permission denied)' },
      ]);
      const reading = await readFound(scan, scan.files[0]!);
      expect(reading).toEqual({
        kind: 'later',
        reason: 'cannot be read by this user (permission denied)',
        quiet: false,
      });
    });
    chmodSync(join(folder, 'a.csv'), 0o644);
    chmodSync(join(folder, 'closed'), 0o755);
    const scan = await listed(folder);
    expect(await readFound(scan, scan.files[0]!)).toMatchObject({ kind: 'read' });
  });

  it('A32 says that the folder is gone, instead of that it is empty', async () => {
    const folder = newFolder();
    rmSync(folder, { recursive: true });
    expect(await scanFolder(folder, { recursive: true })).toEqual({ kind: 'root gone', reason: 'does not exist' });
    writeFileSync(folder, 'now a file');
    expect(await scanFolder(folder, { recursive: true })).toEqual({
      kind: 'root gone',
      reason: 'is not a folder any more',
    });
  });

  it('is bounded in files and depth, and says where it stopped', async () => {
    const folder = newFolder();
    mkdirSync(join(folder, 'a', 'b', 'c'), { recursive: true });
    for (let index = 0; index < 5; index += 1) writeFileSync(join(folder, `${index}.csv`), '');
    const deep = await scanFolder(folder, { recursive: true, deepestFolder: 2 });
    expect(deep).toMatchObject({ refused: [{ path: 'a/b/c', reason: 'folders are nested too deeply' }] });
    const many = await scanFolder(folder, { recursive: false, mostFiles: 3 });
    expect(many).toMatchObject({ refused: [{ reason: 'more than 3 files; the rest is not looked at' }] });
    expect('files' in many && many.files).toHaveLength(3);
  });
});

describe('reading', () => {
  it('A3 A8 A37 gives no bytes of a file that changed, was replaced or vanished since the scan', async () => {
    const folder = newFolder();
    for (const name of ['grown', 'replaced', 'gone', 'still']) writeFileSync(join(folder, name), 'one');
    const scan = await listed(folder);
    appendFileSync(join(folder, 'grown'), 'more');
    writeFileSync(join(folder, 'other'), 'two');
    renameSync(join(folder, 'other'), join(folder, 'replaced'));
    rmSync(join(folder, 'gone'));
    const outcome: Record<string, unknown> = {};
    for (const file of scan.files) outcome[file.path] = await readFound(scan, file);
    expect(outcome).toEqual({
      grown: { kind: 'later', reason: 'changed while it was being read', quiet: true },
      replaced: { kind: 'later', reason: 'changed while it was being read', quiet: true },
      gone: { kind: 'later', reason: 'is gone', quiet: true },
      still: { kind: 'read', bytes: Buffer.from('one') },
    });
  });

  it('A8 gives no bytes while a writer is at it', async () => {
    const folder = newFolder();
    const path = join(folder, 'busy.csv');
    writeFileSync(path, 'a'.repeat(1_000_000));
    const scan = await listed(folder);
    const reading = readFound(scan, scan.files[0]!);
    const writer = openSync(path, 'a');
    for (let index = 0; index < 50; index += 1) {
      appendFileSync(writer, 'more');
      await new Promise((resolve) => setImmediate(resolve));
    }
    closeSync(writer);
    expect(await reading).toMatchObject({ kind: 'later', quiet: true });
  });

  it('A9 refuses a file of 10 GB unread', async () => {
    const folder = newFolder();
    writeFileSync(join(folder, 'huge.csv'), '');
    truncateSync(join(folder, 'huge.csv'), 10 * 1024 ** 3);
    const scan = await listed(folder);
    const before = process.memoryUsage().rss;
    expect(await readFound(scan, scan.files[0]!)).toEqual({
      kind: 'refused',
      reason: 'is 10737418240 bytes long; the limit is 67108864',
    });
    expect(process.memoryUsage().rss - before).toBeLessThan(64 * 1024 ** 2);
  });

  it('A27 refuses a file when a folder on the way was swapped for a link after the scan', async () => {
    const [folder, outside] = [newFolder(), newFolder()];
    mkdirSync(join(folder, 'sub'));
    writeFileSync(join(folder, 'sub', 'a.csv'), 'mine');
    const scan = await listed(folder);
    // The link leads to the very same file, so that all that tells is the way.
    renameSync(join(folder, 'sub'), join(outside, 'sub'));
    symlinkSync(join(outside, 'sub'), join(folder, 'sub'));
    expect(await readFound(scan, scan.files[0]!)).toEqual({
      kind: 'refused',
      reason: 'lies behind a symbolic link; links are not followed',
    });
  });

  it('A28 refuses a file with a second name, and reads it once that is gone', async () => {
    const [folder, outside] = [newFolder(), newFolder()];
    writeFileSync(join(outside, 'secret'), 'secret');
    linkSync(join(outside, 'secret'), join(folder, 'a.csv'));
    const scan = await listed(folder);
    expect(await readFound(scan, scan.files[0]!)).toEqual({
      kind: 'refused',
      reason: 'has 2 names (hard links); deliver a copy with one name',
    });
    rmSync(join(outside, 'secret'));
    const again = await listed(folder);
    expect(again.files[0]?.stamp.signature).not.toBe(scan.files[0]?.stamp.signature);
    expect(await readFound(again, again.files[0]!)).toMatchObject({ kind: 'read' });
  });
});
