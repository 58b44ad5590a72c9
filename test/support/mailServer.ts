import type { AddressInfo } from 'node:net';
import { type ParsedMail, simpleParser } from 'mailparser';
import { SMTPServer } from 'smtp-server';

/** A real mail server on loopback. What it accepted is the truth about what was sent. */
export interface MailServer {
  readonly port: number;
  /** In the order of acceptance. */
  readonly accepted: readonly AcceptedMail[];
  /** Refuses recipients with a permanent (550) or a temporary (451) answer. */
  refuse(recipient: string, code: 550 | 451): void;
  close(): Promise<void>;
}

export interface AcceptedMail {
  readonly recipient: string;
  readonly mail: ParsedMail;
  readonly atMs: number;
}

export async function startMailServer(): Promise<MailServer> {
  const accepted: AcceptedMail[] = [];
  const refused = new Map<string, number>();
  const server = new SMTPServer({
    disabledCommands: ['AUTH', 'STARTTLS'],
    onRcptTo({ address }, _session, callback) {
      const code = refused.get(address);
      callback(code === undefined ? null : Object.assign(new Error('no such mailbox'), { responseCode: code }));
    },
    onData(stream, session, callback) {
      const chunks: Buffer[] = [];
      stream.on('data', (chunk: Buffer) => chunks.push(chunk));
      stream.on('end', () => {
        const atMs = Date.now();
        void simpleParser(Buffer.concat(chunks)).then((mail) => {
          for (const { address } of session.envelope.rcptTo) accepted.push({ recipient: address, mail, atMs });
          callback();
        });
      });
    },
  });
  // A client that is killed in the middle is part of the tests.
  server.on('error', () => {});
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    port: (server.server.address() as AddressInfo).port,
    accepted,
    refuse: (recipient, code) => void refused.set(recipient, code),
    close: () => new Promise((resolve) => server.close(() => resolve())),
  };
}
