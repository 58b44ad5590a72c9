import { type ScheduledTask, schedule, setLogger } from 'node-cron';
import type { Clock } from '../clock.ts';
import { reasonOf } from '../errors.ts';
import type { Log } from '../log.ts';
import { digestDue, digestRule } from './digestDue.ts';

/** What the schedule needs of the world: whether a date has its digest, and the making of one (queued and noted in one transaction). */
export interface DigestDesk {
  wasMade(date: string): boolean;
  make(date: string): Promise<void>;
}

export interface DigestSchedule {
  /** Makes today's digest if it is due; also called at the start and every few minutes. Never throws. */
  catchUp(): Promise<void>;
  stop(): Promise<void>;
}

/** A wall clock that was set, a tick missed while the program was busy, or the hour that spring skips: found again within this time. */
const CATCH_UP_CRON = '*/5 * * * *';

export function startDigestSchedule(options: {
  readonly cron: string;
  readonly zone: string;
  readonly desk: DigestDesk;
  readonly clock: Clock;
  readonly log: Log;
}): DigestSchedule {
  const { desk, clock, log } = options;
  setLogger(cronLogger(log));
  const rule = digestRule(options.cron, options.zone);
  let running: Promise<void> = Promise.resolve();

  const once = async () => {
    const date = digestDue(rule, clock.now(), (day) => desk.wasMade(day));
    if (date === null) return;
    try {
      await desk.make(date);
      log.info({ date }, 'morning digest queued');
    } catch (error) {
      log.error(
        { date, reason: reasonOf(error) },
        'the morning digest could not be made; trying again within 5 minutes',
      );
    }
  };
  const catchUp = () => {
    running = running.then(once);
    return running;
  };

  const tasks: ScheduledTask[] = [
    schedule(options.cron, catchUp, { name: 'digest', timezone: options.zone, suppressMissedWarning: true }),
    schedule(CATCH_UP_CRON, catchUp, { name: 'digest catch-up', timezone: 'UTC', suppressMissedWarning: true }),
  ];
  return {
    catchUp,
    stop: async () => {
      for (const task of tasks) await task.destroy();
      await running;
    },
  };
}

function cronLogger(log: Log): Parameters<typeof setLogger>[0] {
  const words = (message: string | Error) => (message instanceof Error ? message.message : message);
  return {
    info: (message) => log.debug({ from: 'schedule' }, message),
    warn: (message) => log.warn({ from: 'schedule' }, message),
    error: (message) => log.error({ from: 'schedule' }, words(message)),
    debug: (message) => log.debug({ from: 'schedule' }, words(message)),
  };
}
