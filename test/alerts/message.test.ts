import { readFileSync } from 'node:fs';
import { type ParsedMail, simpleParser } from 'mailparser';
import { describe, expect, it } from 'vitest';
import {
  composeEventMail,
  composeStormNotice,
  composeTestMail,
  type EventMail,
  eventJson,
  eventSvg,
  markPossibleDuplicate,
  messagesFor,
  type PlannedMessage,
  renderPng,
  voevent,
  withoutPicture,
} from '../../alerts/index.ts';
import { compose } from '../../alerts/mailer/compose.ts';
import { TEXT_COLUMNS, width } from '../../alerts/text.ts';
import { eventSheet } from '../../alerts/wording/sheet.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { expectGolden } from './golden.ts';
import { GLITCH, MODEL, SETTING, SITE_STEP, samplePicture } from './samples.ts';

const POLICY = {
  to: ['duty@kestrel-ridge.example', 'Timing <timing@kestrel-ridge.example>'],
  extraRecipients: [],
  contact: SETTING.observatory.contact,
  nowMjd: 60_128,
  historicalDays: 30,
  sharperBy: 2,
};

function planned(event: PulsarEvent): PlannedMessage {
  const [message] = messagesFor({ before: null, after: event, told: null, revision: 1 }, POLICY).messages;
  if (!message) throw new Error('nothing to mail');
  return message;
}

function mailOf(event: PulsarEvent, changes: Partial<EventMail> = {}): EventMail {
  const rest = { event, picture: null, model: MODEL, toldRevision: null };
  return { ...rest, ...changes, planned: changes.planned ?? planned(event) };
}

const PLOTTED = { picture: samplePicture() };

/** Names of all header fields of the message, in order. */
function headerNames(mail: ParsedMail): string[] {
  return mail.headerLines.map((line) => line.key);
}

describe('the mail about an event, parsed from its bytes', () => {
  it('D16: has the right headers, each once', async () => {
    const mail = await simpleParser((await composeEventMail(mailOf(GLITCH), SETTING)).mime);
    expect(mail.subject).toBe('Kestrel Ridge · KR 0417+31: candidate glitch · Δν/ν = (3.20 ± 0.21) × 10⁻⁹');
    expect(mail.messageId).toBe(planned(GLITCH).messageId);
    expect(mail.date?.toISOString()).toBe(SETTING.now.toISOString());
    expect(mail.headers.get('auto-submitted')).toBe('auto-generated');
    expect(
      [mail.to]
        .flat()
        .flatMap((t) => t?.value ?? [])
        .map((a) => a.address),
    ).toEqual(['duty@kestrel-ridge.example', 'timing@kestrel-ridge.example']);
    expect(mail.inReplyTo).toBeUndefined();
    const names = headerNames(mail);
    expect(new Set(names).size).toBe(names.length);
  });

  it('says what the text must say, within 78 columns', async () => {
    const { text = '' } = await simpleParser((await composeEventMail(mailOf(GLITCH, PLOTTED), SETTING)).mime);
    for (const line of text.split('\n')) expect(width(line)).toBeLessThanOrEqual(TEXT_COLUMNS);
    expect(text).toMatch(/must be vetted by a person/);
    expect(text).toContain('99.82 % glitch');
    expect(text).toContain('http://127.0.0.1:8420/events/KR0417%2B31-60123-a');
    expectGolden('event.txt', text);
  });

  it('shows the plot inside the HTML, and carries notice and event byte for byte', async () => {
    const mail = await simpleParser((await composeEventMail(mailOf(GLITCH, PLOTTED), SETTING)).mime, {
      skipImageLinks: true,
    });
    const [plot, notice, json] = mail.attachments;
    expect(mail.html).toContain(`cid:${plot?.cid}`);
    expect(plot?.contentDisposition).toBe('inline');
    const sheet = eventSheet(GLITCH, samplePicture(), SETTING.timezone);
    expect(
      plot?.content.equals(await renderPng(eventSvg(samplePicture(), { title: sheet.title, subtitle: sheet.size }))),
    ).toBe(true);
    const context = {
      observatory: SETTING.observatory,
      model: MODEL,
      revision: 1,
      issuedAt: SETTING.now,
      cites: null,
      drill: false,
    };
    expect(notice?.content.toString('utf8')).toBe(voevent(GLITCH, context));
    expect(notice?.contentType).toBe('application/xml');
    expect(json?.content.toString('utf8')).toBe(eventJson(GLITCH));
    expect(JSON.parse(json?.content.toString('utf8') ?? '')).toEqual(GLITCH);
  });

  it('is the same bytes whenever it is composed again', async () => {
    const once = await composeEventMail(mailOf(GLITCH, PLOTTED), SETTING);
    const again = await composeEventMail(mailOf(GLITCH, PLOTTED), SETTING);
    expect(again.mime.equals(once.mime)).toBe(true);
  });

  it('threads an update under the first message and cites the notice before it', async () => {
    const update = {
      ...planned(GLITCH),
      kind: 'update',
      reason: 'size sharpened',
      revision: 4,
      inReplyTo: planned(GLITCH).messageId,
    } as const;
    const mail = await simpleParser(
      (await composeEventMail(mailOf(GLITCH, { planned: update, toldRevision: 1 }), SETTING)).mime,
    );
    expect(mail.inReplyTo).toBe(planned(GLITCH).messageId);
    expect([mail.references].flat()).toEqual([planned(GLITCH).messageId]);
    expect(mail.subject).toMatch(/^Update: /);
    expect(mail.attachments.find((a) => a.contentType === 'application/xml')?.content.toString()).toContain(
      'cite="supersedes"',
    );
  });

  it('a withdrawal and a drill cannot be taken for an alert', async () => {
    const gone = { ...GLITCH, state: 'withdrawn' as const };
    const withdrawal = { ...planned(GLITCH), kind: 'withdrawal', reason: 'withdrawn after it was told' } as const;
    const mail = await simpleParser(
      (await composeEventMail(mailOf(gone, { planned: withdrawal, toldRevision: 1 }), SETTING)).mime,
    );
    expect(mail.subject).toMatch(/^WITHDRAWN: .*withdrawn candidate glitch/);
    expect(mail.attachments.find((a) => a.contentType === 'application/xml')?.content.toString()).toContain(
      'cite="retraction"',
    );
    const drill = await simpleParser(
      (await composeEventMail(mailOf(GLITCH, { planned: { ...planned(GLITCH), kind: 'drill' } }), SETTING)).mime,
    );
    expect(drill.subject).toMatch(/^DRILL: /);
    expect(drill.text).toContain('DRILL: a rehearsal');
    expect(drill.attachments.find((a) => a.contentType === 'application/xml')?.content.toString()).toContain(
      'role="test"',
    );
  });

  it('a site event names the site and its pulsars', async () => {
    const mail = await simpleParser((await composeEventMail(mailOf(SITE_STEP, { model: null }), SETTING)).mime);
    expect(mail.subject).toBe('Kestrel Ridge · Kestrel Ridge (3 pulsars): candidate clock step · Δt = 104.2 ± 2.1 µs');
    expect(mail.text).toContain('KR 0417+31, KR 1902-08, KR 2231+44');
    expect(mail.attachments).toHaveLength(2);
  });

  it('a plot that cannot be drawn does not hold up the mail', async () => {
    const picture = { ...samplePicture(), points: null as never };
    await expect(composeEventMail(mailOf(GLITCH, { picture }), SETTING)).rejects.toThrow();
    const broken = { ...samplePicture(), frequencyTrack: null as never };
    const mail = await simpleParser((await composeEventMail(mailOf(GLITCH, { picture: broken }), SETTING)).mime);
    expect(mail.text).toContain('The plot could not be drawn');
    expect(mail.attachments).toHaveLength(2);
  });
});

describe('D14: names from outside stay names', () => {
  it.each([
    ['CR LF and a header', 'KR\r\nBcc: victim@b.example\r\n'],
    ['a bare LF', 'KR\nSubject: other'],
    ['a bare CR', 'KR\rX: y'],
    ['an encoded word', '=?utf-8?q?=0D=0ABcc:_victim@b.example?='],
    ['markup', '<img src=x onerror=alert(1)>&"\'</title>'],
    ['the end of a message', 'KR\r\n.\r\nMAIL FROM:<x@y.example>'],
    ['unseen characters', 'a\u2028b\u202ec\u0000d\ud800'],
    ['a very long name', 'long '.repeat(300)],
  ])('%s', async (_what, name) => {
    const event = {
      ...GLITCH,
      id: name,
      pulsar: name,
      site: null,
      pulsars: [name],
      explanations: { ...GLITCH.explanations, [name]: 0.3 },
    };
    const setting = { ...SETTING, observatory: { name, contact: SETTING.observatory.contact } };
    const harmless = await simpleParser((await composeEventMail(mailOf(GLITCH), SETTING)).mime);
    const { mime } = await composeEventMail(mailOf(event), setting);
    const mail = await simpleParser(mime);
    expect(headerNames(mail)).toEqual(headerNames(harmless));
    expect([mail.to].flat().flatMap((t) => t?.value ?? [])).toHaveLength(2);
    expect(mail.bcc).toBeUndefined();
    expect(mail.subject).not.toMatch(/[\r\n]/);
    expect(mail.attachments).toHaveLength(2);
    expect(mail.html).not.toMatch(/<img|<script|onerror=alert\(1\)>/);
    // no bare CR or LF (RFC 5322 §2.3), and no line over 998 octets (§2.1.1)
    expect(/\r(?!\n)|(?<!\r)\n/.test(mime.toString('latin1'))).toBe(false);
    expect(
      Math.max(
        ...mime
          .toString('latin1')
          .split('\r\n')
          .map((l) => l.length),
      ),
    ).toBeLessThanOrEqual(998);
  });
});

describe('D15: the mail library', () => {
  /** A file and an address that a composer which reads what it is told to would open. */
  const SECRET = new URL(import.meta.url).pathname;
  it.each([SECRET, `file://${SECRET}`, 'http://127.0.0.1:1/x', `data:text/plain,canary`, `<img src="${SECRET}">`])(
    'opens nothing that a name says: %s',
    async (name) => {
      const parts = {
        ...({ messageId: '<d15@kestrel-ridge.example>', inReplyTo: null, kind: 'notice', eventId: null } as const),
        ...{ recipients: ['duty@kestrel-ridge.example'], subject: name, text: name, html: name },
        picture: { cid: name, fileName: name, png: Buffer.from('picture') },
        attachments: [{ fileName: name, contentType: 'text/plain', content: name }],
      };
      const { mime } = await compose(parts, SETTING);
      const mail = await simpleParser(mime);
      expect(mail.attachments.map(({ content }) => content.toString())).toEqual(['picture', name]);
      expect(mail.text?.trim()).toBe(name);
    },
  );

  it('is given no option but those written down here, and may open neither files nor addresses', () => {
    const source = readFileSync(new URL('../../alerts/mailer/compose.ts', import.meta.url), 'utf8');
    expect(source).toContain('disableFileAccess: true');
    expect(source).toContain('disableUrlAccess: true');
    // Options that let the composer fetch, or take the message from elsewhere.
    expect(source).not.toMatch(/\b(path|href|raw|envelope|list|icalEvent|attachDataUrls):/);
  });
});

describe('other mail', () => {
  it('P4: a possible duplicate says so and stays the same message', async () => {
    const { mime } = await composeEventMail(mailOf(GLITCH), SETTING);
    const [first, copy] = [await simpleParser(mime), await simpleParser(markPossibleDuplicate(mime))];
    expect(copy.subject).toBe(`[possible duplicate] ${first.subject}`);
    expect(copy.messageId).toBe(first.messageId);
    expect(copy.text).toBe(first.text);
    expect(markPossibleDuplicate(markPossibleDuplicate(mime)).equals(markPossibleDuplicate(mime))).toBe(true);
  });

  it('D11: for a server that takes no large mail, the same message without its picture', async () => {
    const { mime } = await composeEventMail(mailOf(GLITCH, PLOTTED), SETTING);
    const lighter = withoutPicture(mime)!;
    const [first, second] = [await simpleParser(mime), await simpleParser(lighter)];
    const names = (mail: typeof first) => mail.attachments.map(({ filename }) => filename);
    expect(lighter.length).toBeLessThan(mime.length / 2);
    expect(second.messageId).toBe(first.messageId);
    expect(second.subject).toBe(first.subject);
    expect(second.text).toBe(first.text);
    const [picture] = first.attachments.filter(({ contentType }) => contentType === 'image/png');
    expect(names(second)).toEqual(
      names(first).map((name) => (name === picture!.filename ? 'picture-left-out.txt' : name)),
    );
    const others = (mail: typeof first) =>
      mail.attachments.filter(({ contentType }) => !/^(image|text)/.test(contentType)).map(({ content }) => content);
    expect(others(second)).toEqual(others(first));
    expect(withoutPicture(lighter)).toBeNull();
  });

  it('D12: one summary an hour', async () => {
    const storm = { name: 'storm.2023-07-02T03', mailedInTheHour: 10 };
    const message = await composeStormNotice(storm, ['a@b.example'], SETTING);
    expect(message.messageId).toBe('<notice.storm.2023-07-02T03@kestrel-ridge.example>');
    const mail = await simpleParser(message.mime);
    expect(mail.text).toMatch(/10 events were mailed within an hour/);
    expect(mail.headers.get('auto-submitted')).toBe('auto-generated');
  });

  it('a test mail says that it is one', async () => {
    const mail = await simpleParser((await composeTestMail(['a@b.example'], SETTING)).mime);
    expect(mail.subject).toBe('Kestrel Ridge · test mail');
    expect(mail.text).toMatch(/Nothing happened to any\s+pulsar/);
  });
});
