import { isIPv6 } from 'node:net';
import type { Clock } from '../../clock.ts';
import { isPassword, NOBODYS_PASSWORD, readPasswordFile } from './passwords.ts';
import { createSessions, type Session, type SessionShelf } from './sessions.ts';
import { createThrottle } from './throttle.ts';

/**
 * Lets reviewers in. On loopback the page stands open until the first password is set; beyond it nobody gets in without one.
 */
export interface Gate {
  /** Visitors must log in. */
  isClosed(): boolean;
  logIn(attempt: LoginAttempt): Promise<LoginOutcome>;
  sessionOf(token: string): Session | null;
  logOut(token: string): void;
}

export interface LoginAttempt {
  readonly name: string;
  readonly password: string;
  readonly address: string;
  /** Of the session that the visitor had until now; null: none. */
  readonly earlierToken: string | null;
}

export type LoginOutcome =
  | { readonly kind: 'in'; readonly token: string }
  | { readonly kind: 'wrong' }
  | { readonly kind: 'too often'; readonly waitSeconds: number }
  /** The passwords cannot be read; the log says why. */
  | { readonly kind: 'out of order' };

export interface GateOptions {
  readonly reviewers: readonly string[];
  readonly passwordFile: string;
  /** The page can be reached from other machines. */
  readonly isOpenToOthers: boolean;
  readonly sessions: SessionShelf;
  readonly clock: Clock;
  /** Never told of a password, nor of a name that is no reviewer's: it may be a password typed into the wrong field. */
  readonly onLogin: (report: LoginReport) => void;
}

export interface LoginReport {
  readonly outcome: LoginOutcome['kind'];
  /** Null: no reviewer's. */
  readonly reviewer: string | null;
  readonly address: string;
  readonly problem?: string;
}

const TRIES_A_NAME = { tries: 5, refillMs: 30_000 } as const;
/** Many reviewers may share one address. */
const TRIES_AN_ADDRESS = { tries: 20, refillMs: 10_000 } as const;
const MOST_KEYS = 10_000;
/** Each takes 32 MiB and a thread that files are read with. */
const MOST_WAITING = 8;

export function createGate(options: GateOptions): Gate {
  const { reviewers, passwordFile, clock, onLogin } = options;
  const sessions = createSessions(options.sessions, clock);
  const shared = { mostKeys: MOST_KEYS, monotonicMs: () => clock.monotonicMs() };
  const byName = createThrottle({ ...TRIES_A_NAME, ...shared });
  const byAddress = createThrottle({ ...TRIES_AN_ADDRESS, ...shared });
  let waiting = 0;
  let last: Promise<unknown> = Promise.resolve();

  const isClosed = () => {
    if (options.isOpenToOthers) return true;
    const read = readPasswordFile(passwordFile);
    return 'problem' in read || read.entries.length > 0;
  };
  const inTurn = async (work: () => Promise<boolean>): Promise<boolean> => {
    waiting += 1;
    const mine = last.then(work).finally(() => {
      waiting -= 1;
    });
    last = mine.catch(() => {});
    return mine;
  };

  const outcomeOf = async (attempt: LoginAttempt): Promise<LoginOutcome & { readonly problem?: string }> => {
    const network = networkOf(attempt.address);
    const nameKey = `${network} ${attempt.name}`;
    const waitMs = Math.max(byAddress.take(network), byName.take(nameKey), waiting >= MOST_WAITING ? 1000 : 0);
    if (waitMs > 0) return { kind: 'too often', waitSeconds: Math.ceil(waitMs / 1000) };
    const read = readPasswordFile(passwordFile);
    if ('problem' in read) return { kind: 'out of order', problem: read.problem };
    const entry = reviewers.includes(attempt.name) ? read.entries.find(({ name }) => name === attempt.name) : undefined;
    const isRight = await inTurn(() => isPassword(attempt.password, entry ?? NOBODYS_PASSWORD));
    if (!isRight || entry === undefined) return { kind: 'wrong' };
    byName.forgive(nameKey);
    return { kind: 'in', token: sessions.open(entry.name, attempt.earlierToken) };
  };

  return {
    isClosed,
    async logIn(attempt) {
      const { problem, ...outcome } = await outcomeOf(attempt);
      const reviewer = reviewers.includes(attempt.name) ? attempt.name : null;
      onLogin({
        outcome: outcome.kind,
        reviewer,
        address: attempt.address,
        ...(problem === undefined ? {} : { problem }),
      });
      return outcome;
    },
    sessionOf(token) {
      const session = sessions.find(token);
      return session !== null && reviewers.includes(session.reviewer) ? session : null;
    },
    logOut: (token) => sessions.end(token),
  };
}

/** Whoever has one IPv6 address usually has the 2⁶⁴ beside it. */
function networkOf(address: string): string {
  if (!isIPv6(address)) return address;
  const [head = '', tail = ''] = address.split('::');
  const front = head === '' ? [] : head.split(':');
  const back = tail === '' ? [] : tail.split(':');
  const zeros = Array.from({ length: Math.max(0, 8 - front.length - back.length) }, () => '0');
  return [...front, ...zeros, ...back]
    .slice(0, 4)
    .map((group) => Number.parseInt(group, 16).toString(16))
    .join(':');
}
