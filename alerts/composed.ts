/** A message ready to be queued: the bytes are the same for each recipient and each attempt. */
export interface ComposedMessage {
  readonly messageId: string;
  readonly subject: string;
  readonly kind: 'event' | 'digest' | 'notice' | 'test';
  readonly eventId: string | null;
  readonly recipients: readonly string[];
  readonly mime: Buffer;
}

/** Who speaks, to whom, and when: the same for every mail. */
export interface MailSetting {
  readonly observatory: { readonly name: string; readonly contact: string };
  /** As configured, `Name <address>` or an address. */
  readonly from: string;
  /** IANA zone of the observatory. */
  readonly timezone: string;
  /** Address of the review page without a trailing slash; null: no links. */
  readonly reviewUrl: string | null;
  readonly now: Date;
}
