import { Readable } from 'node:stream';
import { type ConnectionOptions, rootCertificates } from 'node:tls';
import SMTPConnection, {
  type SMTPConnectionOptions,
  type SMTPConnectionSendInfo,
  type SMTPError,
} from 'nodemailer/lib/smtp-connection';
import { oneLine } from '../markup.ts';
import type { Delivery, DeliveryOutcome, Mailer, MailerDependencies, MailTimeouts, SmtpServer } from './mailer.ts';

/** Mail to a server, and what each way of going wrong means for the message. */

const DEFAULT_TIMEOUTS: MailTimeouts = {
  connectMs: 30_000,
  greetingMs: 300_000,
  silenceMs: 600_000,
  sessionMs: 1_200_000,
};

/** @throws Error for a server that would get the mail over an open network in plain text */
export function smtpMailer(transport: SmtpServer, dependencies: MailerDependencies): Mailer {
  if (transport.secure === 'none' && !isLoopback(transport.host)) {
    throw new Error(
      `mail to ${transport.host} without encryption: allowed only to this machine; use secure = "starttls" or "tls"`,
    );
  }
  const options = connectionOptions(
    transport,
    { ...DEFAULT_TIMEOUTS, ...dependencies.timeouts },
    dependencies.trustedCertificates,
  );
  const sessionMs = dependencies.timeouts?.sessionMs ?? DEFAULT_TIMEOUTS.sessionMs;
  const open = (work: (connection: SMTPConnection) => Promise<DeliveryOutcome>, progress: Progress) =>
    inSession(options, sessionMs, progress, async (connection) => {
      await logIn(connection, transport.user, dependencies.password);
      return work(connection);
    });
  return {
    send(delivery) {
      const progress: Progress = { bodySent: false };
      return open((connection) => transmit(connection, delivery, progress), progress);
    },
    verify() {
      const ready: DeliveryOutcome = { state: 'delivered', detail: `${transport.host}:${transport.port} is ready` };
      return open(async () => ready, { bodySent: false });
    },
  };
}

function connectionOptions(
  server: SmtpServer,
  timeouts: MailTimeouts,
  extra: ConnectionOptions['ca'],
): SMTPConnectionOptions {
  const trusted = extra === undefined ? {} : { ca: [...rootCertificates, ...[extra].flat()] };
  return {
    host: server.host,
    port: server.port,
    secure: server.secure === 'tls',
    requireTLS: server.secure === 'starttls',
    ignoreTLS: server.secure === 'none',
    tls: { minVersion: 'TLSv1.2', rejectUnauthorized: true, ...trusted },
    connectionTimeout: timeouts.connectMs,
    dnsTimeout: timeouts.connectMs,
    greetingTimeout: timeouts.greetingMs,
    socketTimeout: timeouts.silenceMs,
    maxResponseSize: 64 * 1024,
  };
}

/** Whether all of the message was handed to the socket: from then on a lost connection leaves it open who has it. */
interface Progress {
  bodySent: boolean;
}

/** Runs one session from greeting to QUIT; whatever goes wrong in it becomes an outcome, never an exception. */
async function inSession(
  options: SMTPConnectionOptions,
  sessionMs: number,
  progress: Progress,
  work: (connection: SMTPConnection) => Promise<DeliveryOutcome>,
): Promise<DeliveryOutcome> {
  const connection = new SMTPConnection(options);
  let deadline: NodeJS.Timeout | undefined;
  const broken = new Promise<never>((_, reject) => {
    connection.on('error', reject);
    connection.on('end', () => reject(new Error('the server closed the connection')));
    deadline = setTimeout(() => reject(new Error(`no end of the session within ${sessionMs / 1000} s`)), sessionMs);
  });
  broken.catch(() => undefined);
  const connected = new Promise<void>((resolve, reject) =>
    connection.connect((error) => (error ? reject(error) : resolve())),
  );
  try {
    const outcome = await Promise.race([connected.then(() => work(connection)), broken]);
    connection.quit();
    return outcome;
  } catch (error) {
    connection.close();
    return outcomeOf(error, progress);
  } finally {
    clearTimeout(deadline);
  }
}

async function logIn(
  connection: SMTPConnection,
  user: string | null,
  password: MailerDependencies['password'],
): Promise<void> {
  if (user === null) return;
  const pass = await password();
  if (pass === null) throw new LoginError('no password: the password file is missing or empty');
  if (!connection.allowsAuth) throw new LoginError('the server offers no login');
  await new Promise<void>((resolve, reject) =>
    connection.login({ user, pass, credentials: { user, pass } }, (error) => (error ? reject(error) : resolve())),
  );
}

class LoginError extends Error {}

async function transmit(
  connection: SMTPConnection,
  { from, recipient, mime }: Delivery,
  progress: Progress,
): Promise<DeliveryOutcome> {
  const body = Readable.from(chunksOf(mime));
  body.on('end', () => {
    progress.bodySent = true;
  });
  const info = await new Promise<SMTPConnectionSendInfo>((resolve, reject) => {
    connection.send({ from, to: [recipient], size: mime.length }, body, (error, sent) =>
      error ? reject(error) : resolve(sent),
    );
  });
  return { state: 'delivered', detail: shortened(info.response), ...codeOf(info.response) };
}

/** In pieces, so that the end is noticed only when the socket has taken nearly all of it. */
function* chunksOf(mime: Buffer): Generator<Buffer> {
  const size = 16 * 1024;
  for (let at = 0; at < mime.length; at += size) yield mime.subarray(at, at + size);
}

/** What a failure means for the message: RFC 5321 §4.2.1 (4yz try again, 5yz do not) and §4.5.4.1 (retry). */
function outcomeOf(error: unknown, progress: Progress): DeliveryOutcome {
  const failure = error as Partial<SMTPError>;
  const code = failure.responseCode;
  const detail = shortened(failure.message ?? String(error));
  const answer = code === undefined ? { detail } : { detail, responseCode: code };
  if (error instanceof LoginError || failure.code === 'EAUTH') return { state: 'later', ...answer, loginRefused: true };
  if (code === undefined) {
    if (failure.code === 'EENVELOPE') return { state: 'refused', detail };
    if (failure.code === 'EMESSAGE') return { state: 'refused', detail, tooLarge: true };
    return { state: progress.bodySent ? 'unknown' : 'later', detail };
  }
  // 503: the session got out of step, the same mail may pass in the next one
  if (code < 500 || code === 503) return { state: 'later', ...answer };
  // 530, 534, 538 (RFC 4954 §6): our login or encryption is at fault, not the recipient
  if (code === 530 || code === 534 || code === 538) return { state: 'later', ...answer, loginRefused: true };
  // an answer to greeting, EHLO or STARTTLS says something about the server, nothing about the recipient
  if (!ABOUT_THE_MESSAGE.has(failure.command ?? '')) return { state: 'later', ...answer };
  return code === 552 ? { state: 'refused', ...answer, tooLarge: true } : { state: 'refused', ...answer };
}

const ABOUT_THE_MESSAGE = new Set(['MAIL FROM', 'RCPT TO', 'DATA']);

function codeOf(response: string): { responseCode?: number } {
  const code = Number(/^\d{3}/.exec(response)?.[0]);
  return Number.isNaN(code) ? {} : { responseCode: code };
}

function shortened(text: string): string {
  const line = oneLine(text.replace(/[\r\n]+/g, ' '));
  return line.length > 300 ? `${line.slice(0, 300)}…` : line;
}

function isLoopback(host: string): boolean {
  return host === 'localhost' || host === '::1' || /^127\.\d{1,3}\.\d{1,3}\.\d{1,3}$/.test(host);
}
