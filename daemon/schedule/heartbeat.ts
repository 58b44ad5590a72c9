import type { Clock } from '../clock.ts';
import type { HeartbeatSettings, MailHeartbeat, WebHeartbeat } from '../config/heartbeatSettings.ts';
import { reasonOf } from '../errors.ts';
import type { Pulse } from '../health.ts';
import type { Log } from '../log.ts';
import type { HeartbeatSign } from '../review/desk.ts';
import { type Loop, startLoop } from './loop.ts';
import { type Knock, knock } from './webKnock.ts';

/**
 * Says now and then to somebody outside that the watch lives, and only while all of it does. What is noticed there is that it stops: a
 * machine that died cannot send mail about it.
 */
export interface Heartbeats extends Pick<Loop, 'stop'> {
  signs(): readonly HeartbeatSign[];
}

export interface HeartbeatOptions {
  readonly settings: HeartbeatSettings;
  readonly pulse: () => Pulse;
  /** Queues a mail that says the watch lives; `false`: an earlier one has not left yet. */
  readonly mail: (to: readonly string[]) => Promise<boolean>;
  readonly clock: Clock;
  readonly log: Log;
  /** Before the first: what is just starting has not lived yet. */
  readonly ready: Promise<unknown>;
}

const DEADLINE_MS = 10_000;
const MINUTE_MS = 60_000;

export function startHeartbeats(options: HeartbeatOptions): Heartbeats {
  const { web, mail } = options.settings;
  const beats = [
    ...(web === null ? [] : [startBeat(options, 'web', web.everyMinutes, () => beatByWeb(web, options.pulse()))]),
    ...(mail === null ? [] : [startBeat(options, 'mail', mail.everyHours * 60, () => beatByMail(mail, options))]),
  ];
  return {
    signs: () => beats.map(({ sign }) => sign()),
    stop: async () => {
      await Promise.all(beats.map(({ loop }) => loop.stop()));
    },
  };
}

interface Beat {
  readonly loop: Loop;
  readonly sign: () => HeartbeatSign;
}

/** @param attempt answers why the beat was held back or missed; null: it went out */
function startBeat(
  { clock, log, ready }: HeartbeatOptions,
  way: HeartbeatSign['way'],
  everyMinutes: number,
  attempt: () => Promise<string | null>,
): Beat {
  let sign: HeartbeatSign = { way, lastSentAt: null, trouble: 'none was sent yet' };
  let isReady = false;
  void ready.then(() => {
    isReady = true;
    loop.now();
  });
  const loop = startLoop({
    name: `heartbeat by ${way}`,
    pauseMs: everyMinutes * MINUTE_MS,
    log,
    async work() {
      if (!isReady) return;
      const trouble = await attempt().catch(reasonOf);
      if (trouble !== null && trouble !== sign.trouble) log.warn({ way, reason: trouble }, 'no heartbeat');
      if (trouble === null && sign.trouble !== null) log.info({ way }, 'heartbeat sent');
      sign = { way, lastSentAt: trouble === null ? clock.now().toISOString() : sign.lastSentAt, trouble };
    },
  });
  return { loop, sign: () => sign };
}

async function beatByWeb(
  { url, mailBlockedUrl }: WebHeartbeat,
  { stopped, mailBlocked }: Pulse,
): Promise<string | null> {
  if (stopped.length > 0) return `held back: ${stopped.join('; ')}`;
  if (mailBlocked && mailBlockedUrl === null) return 'held back: mail does not leave';
  const answer: Knock = await knock(mailBlocked ? (mailBlockedUrl ?? url) : url, DEADLINE_MS);
  return answer.heard ? null : answer.why;
}

async function beatByMail({ to }: MailHeartbeat, { pulse, mail }: HeartbeatOptions): Promise<string | null> {
  const { stopped, mailBlocked } = pulse();
  if (stopped.length > 0) return `held back: ${stopped.join('; ')}`;
  if (mailBlocked) return 'held back: mail does not leave';
  return (await mail(to)) ? null : 'the one before has not left yet';
}
