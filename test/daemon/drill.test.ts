import { createHash } from 'node:crypto';
import { readdir, readFile } from 'node:fs/promises';
import { join } from 'node:path';
import { type ParsedMail, simpleParser } from 'mailparser';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { drill } from '../../daemon/commands/drill.ts';
import { model } from '../../daemon/commands/model.ts';
import { show } from '../../daemon/commands/show.ts';
import type { Terminal } from '../../daemon/commands/terminal.ts';
import { OperatorError } from '../../daemon/errors.ts';
import { silentLog } from '../../daemon/log.ts';
import { loadOrders, openRecord } from '../../daemon/opening.ts';
import { Pipeline } from '../../daemon/pipeline.ts';
import { createStation } from '../../daemon/station.ts';
import { connect } from '../../daemon/store/connection.ts';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import { find, parseXml } from '../alerts/wellFormed.ts';
import { complaints, type Schema } from '../support/jsonSchema.ts';
import { keptTerminal } from '../support/keptTerminal.ts';
import { createObservatory, type TestObservatory } from '../support/observatory.ts';
import { ROOT } from '../support/sourceTree.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// A rehearsal from the command line to the mail in the folder, and the record as it was.

const START = 61_000;
const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: START });
const arrivals = syntheticArrivals(pulsar, { fromMjd: START + 1, toMjd: START + 180, everyDays: 3, seed: 3 });
const NOW = new Date('2026-05-22T08:00:00.000Z');

let at: TestObservatory;
beforeAll(async () => {
  at = await createObservatory({ pulsars: [pulsar] });
  const { configuration } = loadOrders(at.configFile);
  const store = openRecord(configuration, 'daemon');
  const { tables } = loadTables();
  const clock = { now: () => NOW, monotonicMs: () => 0 };
  const station = createStation({ configuration, store, tables, clock, log: silentLog(), reviewUrl: () => null });
  const bytes = Buffer.from(arrivalFile(arrivals));
  const file = { feed: 'nightly', path: 'a.csv', pathBytes: Buffer.from('a.csv'), bytes, signature: '1' };
  await new Pipeline(station).takeIn(file, { decide: 'now', mail: false, acceptUnterminated: true });
  store.close();
}, 120_000);
afterAll(() => at.remove());

/** Runs a command in this process; what it printed, and its complaint. */
async function run(
  command: (terminal: Terminal) => Promise<void>,
): Promise<{ readonly out: string; readonly error: OperatorError | null }> {
  const terminal = keptTerminal();
  try {
    await command(terminal);
    return { out: terminal.stdout(), error: null };
  } catch (error) {
    if (error instanceof OperatorError) return { out: terminal.stdout(), error };
    throw error;
  }
}
const rehearse = (options: Partial<Parameters<typeof drill>[2]> & { readonly size: string }) =>
  run((terminal) => drill(terminal, pulsar.name, { config: at.configFile, nudot: '0', ...options }));

async function mails(): Promise<ParsedMail[]> {
  const files = (await readdir(at.mailFolder)).filter((name) => name.endsWith('.eml'));
  return Promise.all(files.sort().map(async (name) => simpleParser(await readFile(join(at.mailFolder, name)))));
}

/** Every row of every table. */
function recordDigest(): string {
  const db = connect(join(at.stateFolder, 'record.db'), { mustExist: true });
  try {
    const tables = db.prepare("SELECT name FROM sqlite_schema WHERE type = 'table' ORDER BY name").pluck().all();
    const rows = tables.map((name) => [name, db.prepare(`SELECT * FROM "${name}"`).all()]);
    return createHash('sha256').update(JSON.stringify(rows)).digest('hex');
  } finally {
    db.close();
  }
}

interface DrillJson {
  readonly injected: { readonly epochMjd: number };
  readonly event: { readonly deltaNuOverNuInterval68: readonly [number, number]; readonly deltaNuOverNu: number };
  readonly suspected: { readonly days: number };
  readonly confirmed: { readonly days: number; readonly arrivals: number };
  readonly mail: readonly { readonly recipient: string; readonly state: string }[];
}

describe('a drill', () => {
  test('goes through the whole chain to a mail marked DRILL, and leaves the record as it was', async () => {
    const before = [recordDigest(), await readFile(join(at.stateFolder, 'record.db'))] as const;
    const { out, error } = await rehearse({ size: '2e-7', json: true });
    expect(error).toBeNull();
    const told = JSON.parse(out) as DrillJson;
    expect(told.mail).toEqual([
      expect.objectContaining({ recipient: 'duty@kestrel-ridge.example', state: 'delivered' }),
    ]);
    expect(told.confirmed.days).toBeGreaterThan(0);
    expect(told.confirmed.days).toBeLessThan(30);
    expect(told.confirmed.arrivals).toBeGreaterThan(0);
    expect(told.suspected.days).toBeLessThanOrEqual(told.confirmed.days);
    expect(Math.abs(told.event.deltaNuOverNu / 2e-7 - 1)).toBeLessThan(0.05);

    const [mail, ...more] = await mails();
    expect(more).toEqual([]);
    expect(mail!.subject).toMatch(/^DRILL: /);
    expect(mail!.text).toMatch(/^DRILL: a rehearsal/);
    const notice = mail!.attachments.find(({ contentType }) => contentType === 'application/xml')!.content.toString();
    expect(parseXml(notice).attributes.get('role')).toBe('test');
    expect(find(parseXml(notice), 'Description').at(-1)!.text).toMatch(/^DRILL: /);
    const json = mail!.attachments.find(({ contentType }) => contentType === 'application/json')!.content.toString();
    expect((JSON.parse(json) as { id: string }).id).toMatch(/^DRILL-/);
    const schema = JSON.parse(await readFile(join(ROOT, 'alerts/notice/event.schema.json'), 'utf8')) as Schema;
    expect(complaints(JSON.parse(json), schema)).toEqual([]);

    expect(recordDigest()).toBe(before[0]);
    expect((await readFile(join(at.stateFolder, 'record.db'))).equals(before[1])).toBe(true);
  }, 120_000);

  test('can be put at a date, with a recovery, and mailed to somebody else', async () => {
    const { out, error } = await rehearse({
      size: '3e-7',
      at: String(START + 120.5),
      recovery: '0.3,15',
      nudot: '0.01',
      mailTo: ['trainee@kestrel-ridge.example'],
    });
    expect(error).toBeNull();
    expect(out).toContain('of which 0.3 decays within 15 d, Δν̇/ν̇ = 0.01 at MJD 61120.500');
    expect(out).toMatch(/confirmed: {2}\d+\.\d d after it, by \d+ arrivals?/);
    expect(out).toContain('mail to trainee@kestrel-ridge.example: well');
  }, 120_000);

  test('that is too small fails with words, and mails nobody', async () => {
    const count = (await mails()).length;
    const { out, error } = await rehearse({ size: '1e-13' });
    expect(error?.exitCode).toBe(1);
    expect(error?.message).toContain('neither suspected nor confirmed');
    expect(out).toContain('confirmed:  never');
    expect(await mails()).toHaveLength(count);
  }, 120_000);

  test.each([
    [{ size: '0' }, 2, '--size 0'],
    [{ size: 'big' }, 2, 'must be a number'],
    [{ size: '1e-7', recovery: '0.3' }, 2, 'Q and days'],
    [{ size: '1e-7', recovery: '0.3,-2' }, 2, 'larger than 0'],
    [{ size: '1e-7', daysAgo: '-3' }, 2, 'larger than 0'],
    [{ size: '1e-7', mailTo: ['nobody'] }, 2, 'mail address'],
    [{ size: '1e-7', at: '61001.5' }, 1, '12 are needed'],
    [{ size: '1e-7', at: '61500' }, 1, 'no arrival after'],
  ])('%j is refused', async (options, exitCode, words) => {
    const { error } = await rehearse(options);
    expect(error?.exitCode).toBe(exitCode);
    expect(error?.message).toContain(words);
  });
});

describe('the commands beside it', () => {
  test('model prints a file, or JSON; for a name mistyped it says the nearest', async () => {
    const asFile = await run((terminal) => model(terminal, pulsar.name, { config: at.configFile }));
    expect(asFile.out).toContain('name = "KR 0417+31"');
    expect(asFile.out).toContain('# The start model will');
    const asJson = await run((terminal) => model(terminal, pulsar.name, { config: at.configFile, json: true }));
    const parsed = JSON.parse(asJson.out) as { epochMjd: string; ahead: unknown[]; at: unknown };
    expect(parsed).toMatchObject({ at: null, events: [] });
    expect(parsed.epochMjd).toMatch(/^61\d{3}\.0{16,}$/);
    expect(parsed.ahead).toHaveLength(4);
    const to = join(at.folder, 'now.toml');
    const written = await run((terminal) => model(terminal, pulsar.name, { config: at.configFile, to }));
    expect([written.out, await readFile(to, 'utf8')]).toEqual(['', asFile.out]);
    const none = await run((terminal) => model(terminal, pulsar.name, { config: at.configFile, at: '60000' }));
    expect(none.error?.message).toContain('no arrivals on record by MJD 60000.00');
    const mistyped = await run((terminal) => model(terminal, 'KR 0417+13', { config: at.configFile }));
    expect(mistyped.error?.message).toContain('did you mean KR 0417+31?');
  });

  test('a drill leaves no event to show', async () => {
    const { error } = await run((terminal) => show(terminal, 'DRILL', { config: at.configFile }));
    expect(error?.message).toContain('there is no event');
  });
});
