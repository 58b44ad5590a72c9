// Mail through a mail server as a Debian machine has it, to a mailbox, and read back:  npx tsx test/studies/mailThroughPostfix.ts
// Needs root and postfix; it runs on a port of its own on loopback, in a temporary folder, and is stopped at the end. Checked are the threads (RFC 5322
// §3.6.4), picture and attachments, and what keeps a signature whole on the way (RFC 6376 §5.3: nothing that a server would rewrite; RFC 5321 §4.5.3.1.6
// and RFC 5322 §2.1.1: lines; RFC 7489 §3.1: aligned domains). Writes what it found beside itself.
import assert from 'node:assert/strict';
import { writeFileSync } from 'node:fs';
import { setTimeout as pause } from 'node:timers/promises';
import { type ParsedMail, simpleParser } from 'mailparser';
import { mailerFor } from '../../daemon/mailerFor.ts';
import { morningReview } from '../../daemon/morning.ts';
import { startDelivery } from '../../daemon/schedule/deliver.ts';
import { makeDigest } from '../../daemon/schedule/ownMail.ts';
import { type Postfix, postfixMissing, startPostfix } from '../support/postfix.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const missing = postfixMissing();
if (missing !== null) {
  console.error(`SKIPPED, nothing was tried: ${missing}.`);
  process.exit(0);
}

const START = 61_000;
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: START + 129, deltaNuOverNu: 2e-7 }],
});
const span = { fromMjd: START + 1, toMjd: START + 150, everyDays: 3, seed: 3 };
const arrivals = syntheticArrivals(pulsar, span);
const quietly = syntheticArrivals({ ...pulsar, glitches: [] }, span);
const LONGEST_LINE = 998;

interface Journey {
  readonly sent: Buffer;
  readonly received: Buffer;
  readonly mail: ParsedMail;
}

const postfix = await startPostfix();
const at = await createTestStation({ pulsars: [pulsar], smtpPort: postfix.port, now: '2026-04-22T08:00:00.000Z' });
try {
  const journeys = await sendAll(at, postfix);
  checkThread(journeys);
  for (const journey of journeys) checkWhole(journey);
  const [first] = journeys as [Journey];
  checkParts(first);
  report(journeys);
} finally {
  await at.close();
  await postfix.stop();
}

/** A first alert, its withdrawal, and a digest. */
async function sendAll({ station, store, deliver }: TestStation, { mailbox }: Postfix): Promise<Journey[]> {
  const { configuration, clock, log } = station;
  const sent: Buffer[] = [];
  const mailer = mailerFor(configuration.mail);
  const delivery = startDelivery({
    store,
    mailer: {
      ...mailer,
      send(delivery) {
        sent.push(delivery.mime);
        return mailer.send(delivery);
      },
    },
    from: configuration.mail.from,
    clock,
    log,
    onGivenUp: async (mail, state, why) => assert.fail(`${mail.subject} ${state}: ${why}`),
    onFatal: (error) => assert.fail(String(error)),
  });
  const arrive = async (count: number) => {
    delivery.wake();
    for (let waits = 0; mailbox().length < count && waits < 600; waits++) await pause(100);
    assert.equal(mailbox().length, count, 'mails in the mailbox');
  };
  await deliver('a.csv', arrivalFile(arrivals), { mail: true });
  await arrive(1);
  await deliver('a.csv', arrivalFile(quietly), { mail: true });
  await arrive(2);
  await makeDigest(station, '2026-04-22', morningReview({ configuration, store, clock, warnings: [] }));
  await arrive(3);
  await delivery.stop(5000);
  const parsed = await Promise.all(mailbox().map((received) => simpleParser(received)));
  return parsed.map((mail, i) => {
    const own = sent.find((mime) => /^Message-ID:\s+(<.*>)/m.exec(mime.toString('latin1'))?.[1] === mail.messageId);
    assert.ok(own, `${mail.messageId} is one of ours`);
    return { sent: own, received: mailbox()[i]!, mail };
  });
}

function checkThread(journeys: readonly Journey[]): void {
  const [first, withdrawal, digest] = journeys.map(({ mail }) => mail);
  assert.match(first!.subject!, /^Kestrel Ridge · KR 0417\+31: candidate glitch/);
  assert.equal(first!.inReplyTo, undefined);
  assert.match(withdrawal!.subject!, /^WITHDRAWN: /);
  assert.equal(withdrawal!.inReplyTo, first!.messageId);
  assert.deepEqual([withdrawal!.references].flat(), [first!.messageId]);
  assert.match(digest!.subject!, /Morning review 2026-04-22/);
  assert.equal(digest!.inReplyTo, undefined);
}

function checkParts({ mail }: Journey): void {
  const png = mail.attachments.find(({ contentType }) => contentType === 'image/png');
  assert.deepEqual([...png!.content.subarray(0, 8)], [0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]);
  assert.ok(mail.html && mail.html.length > 0);
  const event = mail.attachments.find(({ contentType }) => contentType === 'application/json');
  assert.equal(JSON.parse(event!.content.toString('utf8')).pulsar, 'KR 0417+31');
  const notice = mail.attachments.find(({ contentType }) => contentType === 'application/xml');
  assert.match(notice!.content.toString('utf8'), /^<\?xml/);
  assert.match(mail.text!.replace(/\s+/g, ' '), /candidate/);
}

/** What left is what came, to the byte, but for the lines that the servers put on top. */
function checkWhole({ sent, received, mail }: Journey): void {
  const text = sent.toString('latin1');
  assert.doesNotMatch(text, /\r(?!\n)|(?<!\r)\n/, 'no bare CR or LF');
  for (const line of text.split('\r\n')) assert.ok(line.length <= LONGEST_LINE, `a line of ${line.length} bytes`);
  const head = text.slice(0, text.indexOf('\r\n\r\n'));
  assert.match(head, /^[\x20-\x7e\r\n\t]*$/, 'headers are ASCII');
  assert.ok(
    sent.every((byte) => byte < 128),
    'the body too: no server need convert it',
  );
  // A mailbox keeps lines without CR.
  assert.ok(received.toString('latin1').endsWith(text.replaceAll('\r\n', '\n')), 'no header or line was rewritten');
  const names = [...head.matchAll(/^([A-Za-z-]+):/gm)].map((found) => found[1]!.toLowerCase());
  for (const name of ['from', 'to', 'subject', 'date', 'message-id', 'mime-version']) {
    assert.equal(names.filter((found) => found === name).length, 1, `${name}: once`);
  }
  const domain = (address: string) => /@([a-z.-]+)/.exec(address)?.[1];
  const envelope = /^Return-Path: (.*)$/m.exec(received.toString('latin1'))?.[1] ?? '';
  assert.equal(domain(envelope), domain(mail.from!.text), 'From and envelope are aligned');
  assert.equal(domain(mail.messageId!), domain(mail.from!.text), 'the Message-ID is of the same domain');
}

function report(journeys: readonly Journey[]): void {
  const result = {
    date: new Date().toISOString().slice(0, 10),
    server: `Postfix ${postfix.version}`,
    mails: journeys.map(({ sent, mail }) => ({
      subject: mail.subject,
      bytes: sent.length,
      longestLine: Math.max(
        ...sent
          .toString('latin1')
          .split('\r\n')
          .map((line) => line.length),
      ),
      inReplyTo: mail.inReplyTo ?? null,
      attachments: mail.attachments.map(({ contentType, size }) => `${contentType}, ${size} bytes`),
    })),
    unchangedOnTheWay: true,
  };
  writeFileSync(new URL('mailThroughPostfix.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
  console.log(JSON.stringify(result, null, 2));
}
