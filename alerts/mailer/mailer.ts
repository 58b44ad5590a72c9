import type { ConnectionOptions } from 'node:tls';

/** One message to one recipient in one session, so that no address can spoil the mail of another. */

/** The same shapes as the configuration's `[mail]`. */
export type MailTransport = SmtpServer | MailFolder;

export interface SmtpServer {
  readonly kind: 'smtp';
  readonly host: string;
  readonly port: number;
  readonly secure: 'tls' | 'starttls' | 'none';
  readonly user: string | null;
}

export interface MailFolder {
  readonly kind: 'folder';
  readonly folder: string;
}

/** One message to one recipient. */
export interface Delivery {
  /** Envelope sender. */
  readonly from: string;
  readonly recipient: string;
  readonly mime: Buffer;
}

/**
 * What became of a delivery. `later`: not accepted, try again, no risk of a copy. `refused`: for good. `unknown`: the whole message
 * was sent and no answer came; the server may have it.
 */
export interface DeliveryOutcome {
  readonly state: 'delivered' | 'later' | 'refused' | 'unknown';
  /** For the log and the page, one line. */
  readonly detail: string;
  readonly responseCode?: number;
  /** The login failed: pause long before the next attempt, or the account may be locked. */
  readonly loginRefused?: true;
  /** Too large for the server: the same mail without its picture may pass. */
  readonly tooLarge?: true;
}

export interface Mailer {
  send(delivery: Delivery): Promise<DeliveryOutcome>;
  /** Connects and logs in without sending: for `check`. For a folder: whether it can be written. */
  verify(): Promise<DeliveryOutcome>;
}

export interface MailerDependencies {
  /** Asked at each login, so that a rotated password is picked up. */
  readonly password: () => Promise<string | null> | string | null;
  readonly timeouts?: Partial<MailTimeouts>;
  /** Extra trusted certificates (PEM), beside those of the host. */
  readonly trustedCertificates?: ConnectionOptions['ca'];
}

export interface MailTimeouts {
  readonly connectMs: number;
  readonly greetingMs: number;
  /** No byte for so long; RFC 5321 §4.5.3.2.6 asks for 10 minutes after the final dot: a short one creates duplicates. */
  readonly silenceMs: number;
  /** The whole session, against a server that drips. */
  readonly sessionMs: number;
}
