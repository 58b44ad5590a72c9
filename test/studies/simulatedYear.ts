// A year of the watch in minutes:  node --expose-gc --import tsx test/studies/simulatedYear.ts [YEAR]
// Real record, real pipeline, real schedule and delivery into a folder; the clock alone is made up and goes on by an hour at a time. Once for a zone
// of Europe and once for one of North America: each civil date must have one digest, over both changes of the clocks, and memory and open files must
// not grow. Writes what it found beside itself.
import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { simpleParser } from 'mailparser';
import { civilTime, mjdOf } from '../../daemon/clock.ts';
import { silentLog } from '../../daemon/log.ts';
import { mailerFor } from '../../daemon/mailerFor.ts';
import { morningReview } from '../../daemon/morning.ts';
import { startDelivery } from '../../daemon/schedule/deliver.ts';
import { startDigestSchedule } from '../../daemon/schedule/digest.ts';
import { makeDigest, reportGivenUp } from '../../daemon/schedule/ownMail.ts';
import { startUpkeep } from '../../daemon/schedule/upkeep.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const year = Number(process.argv[2] ?? 2026);
const HOUR_MS = 3_600_000;
const HOURS_A_FILE = 48;
const START_MS = Date.UTC(year, 0, 1, 12);
const END_MS = Date.UTC(year + 1, 0, 1, 12);

interface Sample {
  readonly month: string;
  readonly heapMb: number;
  readonly residentMb: number;
  readonly openFiles: number;
}

async function liveThrough(zone: string) {
  const folder = mkdtempSync(join(tmpdir(), 'spinvigil-year-'));
  const startMjd = mjdOf(new Date(START_MS));
  const glitches = [{ mjd: startMjd + 200, deltaNuOverNu: 2e-7 }];
  const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: Math.floor(startMjd), glitches });
  const span = { fromMjd: startMjd - 60, toMjd: startMjd + 366, everyDays: 2, seed: 11 };
  const arrivals = syntheticArrivals(pulsar, span);
  const now = new Date(START_MS).toISOString();
  const at = await createTestStation({
    pulsars: [pulsar],
    timezone: zone,
    digestCron: '30 2 * * *',
    expectEveryHours: 120,
    now,
  });
  const running = startWatch(at, folder);
  const samples: Sample[] = [];
  let delivered = 0;
  try {
    for (let ms = START_MS; ms < END_MS; ms += HOUR_MS) {
      at.setNow(new Date(ms).toISOString());
      if (((ms - START_MS) / HOUR_MS) % HOURS_A_FILE === 0) {
        const night = arrivals.slice(delivered).filter(({ mjdText }) => Number(mjdText) < mjdOf(new Date(ms)) - 0.1);
        delivered += night.length;
        if (night.length > 0) await at.deliver(`${ms}.csv`, arrivalFile(night), { mail: true });
      }
      await running.hour();
      const month = new Date(ms).toISOString().slice(0, 7);
      if (samples.at(-1)?.month !== month) samples.push(sample(month));
    }
    samples.push(sample('end'));
    const mails = await mailsIn(folder);
    const events = at.store.events().map(({ event }) => `${event.state} ${event.explanation}`);
    return {
      zone,
      ...digestsByDate(mails, zone),
      mails: countByKind(mails),
      events,
      problems: at.store.verify(),
      samples,
    };
  } finally {
    await running.stop();
    await at.close();
    rmSync(folder, { recursive: true, force: true });
  }
}

/** The daemon's own loops, woken once an hour of the made-up clock. */
function startWatch(at: TestStation, folder: string) {
  const { station, store } = at;
  const { configuration, clock } = station;
  const log = silentLog();
  const mail = { ...configuration.mail, transport: { kind: 'folder', folder } } as const;
  const delivery = startDelivery({
    store,
    mailer: mailerFor(mail),
    from: mail.from,
    clock,
    log,
    onGivenUp: (message, state, why) => reportGivenUp(station, message, state, why),
    onFatal: fail,
  });
  const digest = startDigestSchedule({
    cron: mail.digestCron,
    zone: mail.timezone,
    clock,
    log,
    desk: {
      wasMade: (date) => (store.lastDigest()?.civilDate ?? '') >= date,
      make: (date) => makeDigest(station, date, morningReview({ configuration, store, clock, warnings: [] })),
    },
  });
  const stage = { step() {}, rest() {} };
  const upkeep = startUpkeep(station, {
    onMail: () => delivery.wake(),
    onClockStep: digest.catchUp,
    tableWarnings: () => [],
    onFatal: fail,
    stage,
  });
  return {
    async hour() {
      await digest.catchUp();
      upkeep.now();
      await pause(0);
      delivery.wake();
      while (store.outboxCounts().queued + store.outboxCounts().attempting > 0) await pause(2);
    },
    async stop() {
      await upkeep.stop();
      await digest.stop();
      await delivery.stop(1000);
    },
  };
}

function fail(error: unknown): void {
  throw error;
}

function sample(month: string): Sample {
  globalThis.gc?.();
  const { heapUsed, rss } = process.memoryUsage();
  const openFiles = readdirSync('/proc/self/fd').length;
  return { month, heapMb: Math.round(heapUsed / 1e5) / 10, residentMb: Math.round(rss / 1e6), openFiles };
}

interface Mail {
  readonly kind: string;
  /** By its headers. */
  readonly date: Date;
}

async function mailsIn(folder: string): Promise<Mail[]> {
  const mails: Mail[] = [];
  for (const name of readdirSync(folder)) {
    const { messageId = '', date } = await simpleParser(readFileSync(join(folder, name)));
    mails.push({ kind: /^<(\w+)\./.exec(messageId)?.[1] ?? 'other', date: date ?? new Date(0) });
  }
  return mails;
}

function countByKind(mails: readonly Mail[]): Record<string, number> {
  const counts: Record<string, number> = {};
  for (const { kind } of mails) counts[kind] = (counts[kind] ?? 0) + 1;
  return counts;
}

/** Every civil date of the year against the digests that came on it. */
function digestsByDate(mails: readonly Mail[], zone: string) {
  const seen = new Map<string, number>();
  for (const { kind, date } of mails) {
    if (kind !== 'morning') continue;
    const day = civilTime(date, zone).date;
    seen.set(day, (seen.get(day) ?? 0) + 1);
  }
  const dates: string[] = [];
  for (let ms = START_MS; ms < END_MS; ms += 24 * HOUR_MS) dates.push(new Date(ms).toISOString().slice(0, 10));
  return {
    dates: dates.length,
    withoutDigest: dates.filter((day) => !seen.has(day)),
    withSeveral: [...seen].filter(([, count]) => count > 1).map(([day]) => day),
  };
}

const startedMs = Date.now();
const zones = [];
for (const zone of ['Europe/Berlin', 'America/New_York']) zones.push(await liveThrough(zone));
const result = {
  date: new Date().toISOString().slice(0, 10),
  year,
  minutes: Math.round((Date.now() - startedMs) / 6e4),
  zones,
};
writeFileSync(new URL('simulatedYear.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(JSON.stringify(result, null, 2));
