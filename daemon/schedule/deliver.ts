import {
  type DeliveryOutcome,
  EXPIRES_AFTER_MS,
  type Mailer,
  markPossibleDuplicate,
  pauseMs,
  withoutPicture,
} from '../../alerts/index.ts';
import { type Clock, clockStepWatch } from '../clock.ts';
import { reasonOf } from '../errors.ts';
import type { Log } from '../log.ts';
import type { Stage } from '../progress.ts';
import type { OutboxRecord } from '../records.ts';
import { step } from '../store/crashStep.ts';
import type { ClaimedMail, MailOutcome } from '../store/shapes.ts';
import type { Store } from '../store/store.ts';
import { storageTrouble } from '../store/trouble.ts';

/**
 * Empties the outbox: claims one message to one recipient, sends it, notes what became of it. A recipient in trouble waits by itself;
 * only a refused login holds everything back, or the account would be locked. What happens to mail never stops the intake.
 */
export interface DeliveryLoop {
  /** Something was queued: look now. */
  wake(): void;
  /** In words for the health page: why mail does not leave; null: it does. */
  trouble(): string | null;
  /** Ends after the message in hand, or after `graceMs` at the latest: then that message stays marked as attempted and goes again. */
  stop(graceMs: number): Promise<void>;
}

export interface DeliveryOptions {
  readonly store: Store;
  readonly mailer: Mailer;
  /** Envelope sender. */
  readonly from: string;
  readonly clock: Clock;
  readonly log: Log;
  /** A message ended without being delivered, for good. */
  readonly onGivenUp: (mail: OutboxRecord, state: 'refused' | 'expired', why: string) => Promise<void>;
  /** The store failed in a way that must not be retried. */
  readonly onFatal: (error: unknown) => void;
  /** Told at every turn and attempt. */
  readonly stage?: Stage;
}

/** One attempt may take as long as RFC 5321, section 4.5.3.2, lets a server take for all its answers. */
export const DELIVERY_LIMIT_MS = 1_800_000;

const LOOK_EVERY_MS = 15_000;
const STORE_RETRY_MS = 5_000;

export function startDelivery(options: DeliveryOptions): DeliveryLoop {
  const { store, clock, log } = options;
  const stopping = new AbortController();
  let loginPausedUntilMs = 0;
  let lastTrouble: string | null = null;
  let rouse: () => void = () => {};
  let wakeAsked = false;

  const pause = (ms: number) =>
    new Promise<void>((resolve) => {
      const timer = setTimeout(resolve, wakeAsked ? 0 : ms);
      wakeAsked = false;
      rouse = () => {
        clearTimeout(timer);
        resolve();
      };
    });

  const sendOne = async (): Promise<boolean> => {
    if (clock.monotonicMs() < loginPausedUntilMs) return false;
    const mail = store.claimDue(clock.now().toISOString());
    if (mail === null) return false;
    const { outcome, remark } = await attempt(options, mail);
    lastTrouble = outcome.state === 'delivered' ? null : outcome.detail;
    if (outcome.loginRefused) loginPausedUntilMs = clock.monotonicMs() + pauseMs(pauseKey(mail), 'login refused');
    await note(options, mail, settled(mail, outcome, { remark, clock }), stopping.signal);
    options.stage?.step();
    return true;
  };

  const mayExpire = trustInWallClock(clock);
  const loop = async () => {
    while (!stopping.signal.aborted) {
      options.stage?.step();
      try {
        if (mayExpire()) await expireOld(options);
        while (!stopping.signal.aborted && (await sendOne()));
      } catch (error) {
        if (!mayPass(error)) return options.onFatal(error);
        log.error({ reason: reasonOf(error) }, 'the outbox cannot be written; mail waits');
      }
      if (!stopping.signal.aborted) await pause(LOOK_EVERY_MS);
    }
  };
  const running = loop();

  return {
    wake() {
      wakeAsked = true;
      rouse();
    },
    trouble: () => lastTrouble,
    async stop(graceMs) {
      stopping.abort();
      rouse();
      const grace = new Promise<void>((resolve) => setTimeout(resolve, graceMs).unref());
      await Promise.race([running, grace]);
    },
  };
}

interface Attempt {
  readonly outcome: DeliveryOutcome;
  /** What the person should know who finds the message other than it was queued; null: nothing. */
  readonly remark: string | null;
}

async function attempt({ mailer, from, log }: DeliveryOptions, mail: ClaimedMail): Promise<Attempt> {
  const composed = Buffer.from(mail.content, 'latin1');
  const mime = mail.possibleDuplicate ? markPossibleDuplicate(composed) : composed;
  const send = (bytes: Buffer) => mailer.send({ from, recipient: mail.recipient, mime: bytes });
  try {
    const outcome = await send(mime);
    const lighter = outcome.tooLarge ? withoutPicture(mime) : null;
    step('mail sent');
    // The server has not taken the whole message, so that a lighter one is no second copy.
    return lighter === null
      ? { outcome, remark: null }
      : { outcome: await send(lighter), remark: `too large with its picture (${outcome.detail}); sent without` };
  } catch (error) {
    log.error({ err: error, messageId: mail.messageId }, 'sending failed in an unforeseen way');
    return { outcome: { state: 'later', detail: reasonOf(error) }, remark: null };
  }
}

function settled(
  mail: ClaimedMail,
  outcome: DeliveryOutcome,
  { remark, clock }: { readonly remark: string | null; readonly clock: Clock },
): MailOutcome {
  const now = clock.now();
  if (outcome.state === 'delivered') {
    return { kind: 'delivered', at: now.toISOString(), ...(remark === null ? {} : { remark }) };
  }
  const error = remark === null ? outcome.detail : `${remark}: ${outcome.detail}`;
  const at = now.toISOString();
  if (outcome.state === 'refused') return { kind: 'refused', error, at };
  const cause = outcome.loginRefused ? 'login refused' : outcome.state;
  const dueAt = new Date(now.getTime() + pauseMs(pauseKey(mail), cause)).toISOString();
  return { kind: outcome.state, dueAt, error, at };
}

function pauseKey(mail: ClaimedMail): { id: string; attempts: number } {
  return { id: `${mail.messageId} ${mail.recipient}`, attempts: mail.attempts };
}

/** Writes the outcome down, again and again while the disk is full: a delivery that is forgotten is a duplicate. */
async function note(
  options: DeliveryOptions,
  mail: ClaimedMail,
  outcome: MailOutcome,
  stopping: AbortSignal,
): Promise<void> {
  const { store, log } = options;
  const facts = { messageId: mail.messageId, to: mail.recipient, attempt: mail.attempts };
  for (;;) {
    try {
      store.settle(mail.id, outcome);
      break;
    } catch (error) {
      if (!mayPass(error) || stopping.aborted) throw error;
      log.error({ ...facts, reason: reasonOf(error) }, 'what became of a mail cannot be noted yet; trying again');
      options.stage?.step();
      await new Promise((resolve) => setTimeout(resolve, STORE_RETRY_MS));
    }
  }
  if (outcome.kind === 'delivered') log.info({ ...facts, subject: mail.subject }, 'mail delivered');
  else if (outcome.kind === 'refused' || outcome.kind === 'expired') {
    log.error({ ...facts, reason: outcome.error }, `mail ${outcome.kind}`);
    await options.onGivenUp(mail, outcome.kind, outcome.error);
  } else log.warn({ ...facts, reason: outcome.error, again: outcome.dueAt }, 'mail not delivered yet');
}

/** A wall clock that was set a year ahead must not give up all mail at once: for some hours after a step nothing expires. */
function trustInWallClock(clock: Clock): () => boolean {
  const clockStep = clockStepWatch(clock);
  let distrustUntilMs = 0;
  return () => {
    if (clockStep() !== null) distrustUntilMs = clock.monotonicMs() + DISTRUST_MS;
    return clock.monotonicMs() >= distrustUntilMs;
  };
}

const DISTRUST_MS = 6 * 3_600_000;

async function expireOld(options: DeliveryOptions): Promise<void> {
  const now = options.clock.now();
  const before = new Date(now.getTime() - EXPIRES_AFTER_MS).toISOString();
  const end = { error: 'not delivered in five days', at: now.toISOString() };
  for (const mail of options.store.expireOlderThan(before, end)) {
    options.log.error({ messageId: mail.messageId, to: mail.recipient }, 'mail expired');
    await options.onGivenUp(mail, 'expired', 'it could not be delivered in five days');
  }
}

function mayPass(error: unknown): boolean {
  const trouble = storageTrouble(error);
  return trouble === 'busy' || trouble === 'full';
}
