import { mkdir, readFile, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import { parse as parseCsv } from 'csv-parse/sync';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { createObservatory, type TestObservatory } from '../support/observatory.ts';
import { type Finished, runInstalled, runSpinvigil, spinvigilJson } from '../support/spinvigil.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// Every command as a person types it: what it prints, and what the shell learns. Most run in this process; that the installed program answers
// alike is tried once for each exit code here, and in the other files of this folder.

const COMMANDS = [
  'watch',
  'check',
  'replay',
  'events',
  'show',
  'review',
  'reviewer',
  'morning',
  'limits',
  'plan',
  'arrivals',
  'model',
  'drill',
  'export',
  'backup',
  'restore',
];
const START = 61_000;
const glitching = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: START + 100, deltaNuOverNu: 2e-7 }],
});
const quiet = syntheticPulsar({ name: 'KR 1021-05', epochMjd: START });
const span = { fromMjd: START + 1, toMjd: START + 130, everyDays: 5 };
const ARRIVALS_EACH = 26;

let at: TestObservatory;
let config: readonly string[];
let event: PulsarEvent;
let replayed: Finished;

beforeAll(async () => {
  at = await createObservatory({ pulsars: [glitching, quiet] });
  config = ['--config', at.configFile];
  const files = [glitching, quiet].map((pulsar, i) => ({
    name: `${i}.csv`,
    content: arrivalFile(syntheticArrivals(pulsar, { ...span, seed: i })),
  }));
  for (const { name, content } of files) await at.drop(name, content);
  replayed = await runInstalled(['replay', ...files.map(({ name }) => join(at.feedFolder, name)), ...config]);
  [event] = (await spinvigilJson<PulsarEvent[]>(['events', ...config])) as [PulsarEvent];
}, 60_000);
afterAll(() => at.remove());

const run = (...args: string[]) => runSpinvigil([...args, ...config]);

describe('help', () => {
  test.each(COMMANDS)('of %s', async (command) => {
    const { code, stdout } = await runSpinvigil([command, '--help']);
    expect(code).toBe(0);
    expect(stdout).toMatch(new RegExp(`^Usage: spinvigil ${command} `));
    expect(stdout).toContain('--config <file>');
  });

  test('of the program names every command, and no other', async () => {
    const { code, stdout } = await runInstalled(['--help']);
    expect(code).toBe(0);
    expect((await runSpinvigil(['--help'])).stdout).toBe(stdout);
    const listed = [...stdout.matchAll(/^ {2}([a-z]+) (?:\[options\]|\[command\])/gm)].map(([, name]) => name);
    expect(listed.filter((name) => name !== 'help').sort()).toEqual([...COMMANDS].sort());
  });
});

describe('wrong usage', () => {
  test.each([
    [['evnets'], /Did you mean events\?/],
    [['events', '--pulser', 'x'], /Did you mean --pulsar\?/],
    [['events', '--state', 'lost'], /Allowed choices are suspected, confirmed/],
    [['show'], /missing required argument 'event'/],
    [['replay'], /missing required argument 'file'/],
    [[], /Usage: spinvigil/],
  ] as const)('%s ends with 2', async (args, complaint) => {
    const { code, stderr } = await runSpinvigil(args);
    expect(code).toBe(2);
    expect(stderr).toMatch(complaint);
  });

  test('of the installed program ends with 2 as well', async () => {
    expect(await runInstalled(['evnets'])).toEqual(await runSpinvigil(['evnets']));
  });

  test('a configuration that is missing or wrong ends with 2, and says where', async () => {
    const missing = await runSpinvigil(['check', '--config', join(at.folder, 'no.toml')]);
    expect(missing.code).toBe(2);
    expect(missing.stdout).toContain('no.toml');
    const wrong = join(at.folder, 'wrong.toml');
    await writeFile(wrong, (await readFile(at.configFile, 'utf8')).replace('poll_seconds', 'pol_seconds'));
    const checked = await runSpinvigil(['events', '--config', wrong]);
    expect(checked.code).toBe(2);
    expect(checked.stderr).toMatch(/wrong\.toml:\d+:\d+: .*pol_seconds.*poll_seconds/);
  });

  test('dates, verdicts and names that are none', async () => {
    expect(await run('events', '--since', 'yesterday')).toMatchObject({ code: 2 });
    expect(await run('morning', '--date', '2026-02-30')).toMatchObject({ code: 2 });
    expect(await run('review', event.id, '--accept', '--reject', '--by', 'duty')).toMatchObject({ code: 2 });
    const stranger = await run('review', event.id, '--accept', '--by', 'stranger');
    expect(stranger).toMatchObject({ code: 2 });
    const pulsar = await run('arrivals', 'KR 0417+13');
    expect(pulsar.code).toBe(2);
    expect(pulsar.stderr).toContain('did you mean KR 0417+31?');
  });
});

describe('work that cannot be done ends with 1', () => {
  test('an event that is not there', async () => {
    const { code, stderr } = await runInstalled(['show', 'nothing', ...config]);
    expect(code).toBe(1);
    expect(stderr).toBe('spinvigil: there is no event nothing; spinvigil events lists them\n');
  });

  test('a record that is not there', async () => {
    const empty = join(at.folder, 'empty.toml');
    await writeFile(empty, (await readFile(at.configFile, 'utf8')).replace('folder = "state"', 'folder = "none"'));
    expect(await runSpinvigil(['events', '--config', empty])).toMatchObject({ code: 1 });
  });

  test('a file that cannot be read', async () => {
    const { code, stderr } = await run('replay', join(at.feedFolder, 'absent.csv'));
    expect(code).toBe(1);
    expect(stderr).toContain('absent.csv');
  });

  test('a copy that is none', async () => {
    const { code, stderr } = await run('restore', at.configFile);
    expect(code).toBe(1);
    expect(stderr).toContain('Nothing was changed');
  });
});

describe('the commands', () => {
  test('replay sums up what it took in, with a line of progress per 10 % off a screen', () => {
    expect(replayed.code, replayed.stderr).toBe(0);
    expect(replayed.stdout).toMatch(/^2 files, 52 rows, 52 new arrivals, 0 quarantined\n/);
    expect(replayed.stdout).toContain('KR 0417+31');
    expect(replayed.stderr).toMatch(/100 % {2}2 of 2 files\n/);
    expect(replayed.stderr).not.toContain('\r');
  });

  test('check finds a sound configuration sound', async () => {
    const { code, stdout } = await run('check');
    expect(code).toBe(0);
    expect(stdout).toMatch(/spinvigil\.toml is sound: 1 feeds, 0 sites, 2 pulsars\./);
    expect(stdout).toContain('mail: login: well');
  });

  test('check --send-test-mail sends one', async () => {
    const { code, stdout } = await run('check', '--send-test-mail');
    expect(code).toBe(0);
    expect(stdout).toContain('test mail to duty@kestrel-ridge.example: well');
  });

  test('events filters', async () => {
    const ids = async (...args: string[]) =>
      (await spinvigilJson<PulsarEvent[]>(['events', ...args, ...config])).map(({ id }) => id);
    expect(await ids('--pulsar', 'KR 0417+31')).toEqual([event.id]);
    expect(await ids('--pulsar', 'KR 1021-05')).toEqual([]);
    expect(await ids('--state', 'confirmed', '--since', '61090')).toEqual([event.id]);
    expect(await ids('--state', 'withdrawn')).toEqual([]);
    expect(await ids('--since', '61120')).toEqual([]);
    expect((await run('events')).stdout).toContain('candidate glitch');
  });

  test('events --json has the fields of the contract', () => {
    expect(event).toMatchObject({ pulsar: 'KR 0417+31', state: 'confirmed', explanation: 'glitch', site: null });
    for (const field of ['epochInterval68', 'deltaNuHzInterval68', 'deltaNuOverNuInterval68'] as const) {
      expect(event[field]).toHaveLength(2);
    }
    expect(event.recovery).toHaveProperty('terms');
  });

  test('arrivals says what was done with each', async () => {
    const lines = await spinvigilJson<Record<string, unknown>[]>(['arrivals', 'KR 0417+31', ...config]);
    expect(lines).toHaveLength(ARRIVALS_EACH);
    expect(lines[0]).toMatchObject({ site: 'barycentre', frequencyMhz: null, fate: 'used', delays: { roemerS: 0 } });
    // Already at the barycentre, so the digits that were received are the digits that come out (a double holds 16).
    const { mjd, barycentreTdbMjd } = lines[0] as { mjd: string; barycentreTdbMjd: string };
    expect(barycentreTdbMjd).toMatch(/^\d{5}\.\d{16,}$/);
    expect(barycentreTdbMjd.slice(0, 21)).toBe(mjd);
    const header = (await run('arrivals', 'KR 0417+31')).stdout.split('\n')[0];
    for (const title of ['Roemer s', 'dispersion s', 'orbit s', 'deviation, turns', 'fate', 'reason']) {
      expect(header).toContain(title);
    }
  });

  test('arrivals --csv is what --json says, read by a reader of its own', async () => {
    const lines = await spinvigilJson<Record<string, unknown>[]>(['arrivals', 'KR 0417+31', ...config]);
    const { stdout } = await run('arrivals', 'KR 0417+31', '--csv');
    const rows = parseCsv(stdout, { columns: true }) as Record<string, string>[];
    expect(rows).toHaveLength(lines.length);
    rows.forEach((row, i) => {
      const { mjd, barycentreTdbMjd, delays, deviationTurns, fate, reason } = lines[i]!;
      expect(row).toMatchObject({ mjd_as_received: mjd, barycentre_mjd_tdb: barycentreTdbMjd, frequency_mhz: 'inf' });
      expect(row).toMatchObject({ fate, reason, roemer_s: String((delays as { roemerS: number }).roemerS) });
      expect(Number(row['deviation_turns'])).toBe(deviationTurns);
    });
  });

  test('show tells all about one', async () => {
    const { stdout } = await run('show', event.id);
    for (const words of ['KR 0417+31: candidate glitch', 'Epoch', 'History:', 'must be vetted']) {
      expect(stdout).toContain(words);
    }
    const record = await spinvigilJson<{ event: PulsarEvent; history: unknown[] }>(['show', event.id, ...config]);
    expect(record.event).toEqual(event);
    expect(record.history).toHaveLength(1);
  });

  test('model prints the post-glitch model, which check takes in the models folder', async () => {
    const { code, stdout } = await run('model', 'KR 0417+31');
    expect(code).toBe(0);
    expect(stdout).toContain(`# Holds candidate glitch ${event.id}`);
    expect(stdout).toMatch(/had drifted by 0\.1 turn .* do not fold with it/);
    const other = await createObservatory({ pulsars: [quiet] });
    try {
      await writeFile(join(other.folder, 'models', 'current.toml'), stdout);
      const checked = await runSpinvigil(['check', '--config', other.configFile]);
      expect(checked.stdout).toContain('is sound: 1 feeds, 0 sites, 2 pulsars.');
      expect(checked.code).toBe(0);
    } finally {
      await other.remove();
    }
  });

  test('drill rehearses, and the log is as it was', async () => {
    const before = await spinvigilJson<PulsarEvent[]>(['events', ...config]);
    const { code, stdout, stderr } = await run('drill', 'KR 1021-05', '--size', '3e-7');
    expect(code, stderr).toBe(0);
    expect(stdout).toMatch(/confirmed: {2}\d/);
    expect(await spinvigilJson<PulsarEvent[]>(['events', ...config])).toEqual(before);
    const small = await run('drill', 'KR 1021-05', '--size', '1e-14');
    expect(small.code).toBe(1);
    expect(small.stderr).toContain('nobody would have been told');
  });

  test('export writes a notice', async () => {
    expect((await run('export', event.id, '--as', 'voevent')).stdout).toMatch(/^<\?xml[\s\S]*VOEvent/);
    expect(JSON.parse((await run('export', event.id, '--as', 'json')).stdout)).toEqual(event);
    expect((await run('export', event.id, '--as', 'csv')).stdout.trimEnd().split(/\r?\n/)).toHaveLength(2);
  });

  test('morning shows what waits, as text, page and data', async () => {
    const page = join(at.folder, 'morning.html');
    const { stdout } = await run('morning');
    expect(stdout).toContain('KR 0417+31: candidate glitch');
    expect((await run('morning', '--html', page)).code).toBe(0);
    expect(await readFile(page, 'utf8')).toContain('KR 0417+31');
    const review = await spinvigilJson<{ waiting: PulsarEvent[]; date: string }>(['morning', ...config]);
    expect(review.waiting.map(({ id }) => id)).toEqual([event.id]);
    expect(review.date).toMatch(/^\d{4}-\d{2}-\d{2}$/);
  });

  test('review records a verdict; backup and restore bring it back as it was', async () => {
    const copy = join(at.folder, 'copy.db');
    expect((await run('backup', copy)).code).toBe(0);
    const accepted = await run('review', event.id, '--accept', '--by', 'duty', '--note', 'seen in both receivers');
    expect(accepted.stdout).toBe(`${event.id} is accepted (revision 2).\n`);
    expect((await run('show', event.id)).stdout).toContain('accept by duty: seen in both receivers');
    expect((await run('review', event.id, '--accept', '--by', 'duty', '--note', 'again')).code).toBe(1);
    expect((await run('review', event.id, '--reopen', '--by', 'duty')).stdout).toContain('is confirmed');

    const restored = await run('restore', copy);
    expect(restored.code, restored.stderr).toBe(0);
    expect(restored.stdout).toContain('What was there is kept as');
    expect((await run('show', event.id)).stdout).not.toContain('Verdicts:');
    expect(await spinvigilJson<PulsarEvent[]>(['events', ...config])).toEqual([event]);
  });

  test('replay of the files one by one, backwards, gives the same events', async () => {
    const other = await createObservatory({ pulsars: [glitching, quiet] });
    try {
      const halves = [glitching, quiet].flatMap((pulsar, i) => {
        const arrivals = syntheticArrivals(pulsar, { ...span, seed: i });
        return [arrivals.slice(0, 15), arrivals.slice(15)];
      });
      for (const [i, half] of [...halves.entries()].reverse()) {
        const file = join(other.folder, 'elsewhere', `${i}.csv`);
        await mkdir(join(other.folder, 'elsewhere'), { recursive: true });
        await writeFile(file, arrivalFile(half));
        const where = ['--feed', 'nightly', '--config', other.configFile];
        const { code, stderr } = await runSpinvigil(['replay', file, ...where]);
        expect(code, stderr).toBe(0);
      }
      expect(await spinvigilJson<PulsarEvent[]>(['events', '--config', other.configFile])).toEqual([event]);
    } finally {
      await other.remove();
    }
  });
});
