import assert from 'node:assert/strict';
import {
  appendFileSync,
  existsSync,
  mkdirSync,
  readFileSync,
  renameSync,
  rmSync,
  symlinkSync,
  truncateSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, it } from 'vitest';
import { createFeedLook } from '../../../daemon/watch/feedLook.ts';
import type { TakenFile } from '../../../daemon/watch/feedMemory.ts';
import { readStill } from '../../../daemon/watch/open.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();
const SETTLE_MS = 1000;
const SETTINGS = { settleMs: SETTLE_MS, longSettleMs: 3 * SETTLE_MS, restlessMs: 1e9 };

const name = fc.constantFrom('a', 'b', 'c', 'sub/d');
type Action =
  | Change
  | { readonly kind: 'look'; readonly waitMs: number }
  | { readonly kind: 'restart' }
  | { readonly kind: 'away' };
interface Change {
  readonly kind: 'write' | 'append' | 'truncate' | 'remove' | 'link' | 'rename';
  readonly name: string;
  /** For `rename`. */
  readonly to: string;
}

const action: fc.Arbitrary<Action> = fc.oneof(
  fc.record({ kind: fc.constantFrom('write', 'append', 'truncate', 'remove', 'link', 'rename'), name, to: name }),
  fc.record({ kind: fc.constant('look'), waitMs: fc.constantFrom(1, 300, 1000, 4000) }),
  fc.record({ kind: fc.constant('restart') }),
  fc.record({ kind: fc.constant('away') }),
);

/** What stands in the folder, as the test itself wrote it, with the time of the last change. */
interface Written {
  readonly content: string;
  readonly changedMs: number;
}

function createWorld() {
  const folder = newFolder();
  mkdirSync(join(folder, 'sub'));
  const model = new Map<string, Written>();
  const taken = new Map<string, TakenFile & { readonly content: string }>();
  const recall = (_feed: string, { path }: { path: string }) => taken.get(path) ?? null;
  const fresh = () => createFeedLook({ name: 'feed', folder, recursive: true }, recall, SETTINGS);
  let watched = fresh();
  let nowMs = 0;
  let writes = 0;

  /** Each content has a length of its own: the change time of a file system is too coarse to tell two writes of a moment apart. */
  const text = () => {
    writes += 1;
    return `${writes} ${'x'.repeat(writes)}`;
  };
  const put = (path: string, content: string) => model.set(path, { content, changedMs: nowMs });

  const look = async () => {
    for (const file of (await watched.look(nowMs)).ready) {
      const reading = await readStill({ root: file.root, pathBytes: file.pathBytes, signature: file.stamp.signature });
      assert.equal(reading.kind, 'read');
      const content = reading.kind === 'read' ? reading.bytes.toString() : '';
      const written = model.get(file.path);
      assert.equal(content, written?.content, `${file.path} was handed over with a content that does not stand there`);
      assert.ok(nowMs - written!.changedMs >= SETTLE_MS, `${file.path} was handed over before it settled`);
      assert.notEqual(taken.get(file.path)?.signature, file.stamp.signature, 'handed over twice');
      taken.set(file.path, { ...file.stamp, content });
      watched.taken(file, nowMs);
    }
  };

  const apply = async (step: Action) => {
    if (step.kind === 'look') {
      nowMs += step.waitMs;
      return look();
    }
    if (step.kind === 'restart') {
      watched = fresh();
      return;
    }
    if (step.kind === 'away') {
      renameSync(folder, `${folder}-away`);
      assert.equal((await watched.look(nowMs)).root, null);
      renameSync(`${folder}-away`, folder);
      return;
    }
    change(step);
  };

  const change = (step: Change) => {
    const path = join(folder, step.name);
    const there = model.get(step.name);
    if (step.kind === 'link') {
      if (there === undefined && !existsSync(path)) {
        rmSync(path, { force: true });
        symlinkSync('/etc/hostname', path);
      }
      return;
    }
    if (step.kind === 'remove' || there === undefined) rmSync(path, { force: true });
    if (step.kind === 'remove') model.delete(step.name);
    else if (step.kind === 'write') {
      const content = text();
      writeFileSync(path, content);
      put(step.name, content);
    } else if (there === undefined) return;
    else if (step.kind === 'append') {
      const more = text();
      appendFileSync(path, more);
      put(step.name, there.content + more);
    } else if (step.kind === 'truncate') {
      const half = there.content.slice(0, Math.floor(there.content.length / 2));
      truncateSync(path, half.length);
      put(step.name, half);
    } else if (step.to !== step.name) {
      renameSync(path, join(folder, step.to));
      model.delete(step.name);
      put(step.to, there.content);
    }
  };

  return {
    apply,
    async checkQuiescence() {
      for (let turn = 0; turn < 3; turn += 1) {
        nowMs += SETTINGS.longSettleMs + 1;
        await look();
      }
      for (const [path, { content }] of model)
        assert.equal(taken.get(path)?.content, content, `${path} was never handed over`);
      for (const [path, { content }] of model) assert.equal(readFileSync(join(folder, path), 'utf8'), content);
      const last = await watched.look(nowMs + 1);
      assert.deepEqual([last.ready, last.moving], [[], 0]);
    },
  };
}

describe('random writers', () => {
  it('A1 A3 A7 A27 A32 A37 A43 get each settled content handed over, and nothing else', async () => {
    await fc.assert(
      fc.asyncProperty(fc.array(action, { maxLength: 30 }), async (steps) => {
        const world = createWorld();
        for (const step of steps) await world.apply(step);
        await world.checkQuiescence();
      }),
      { numRuns: 60 },
    );
  });
});
