import { simpleParser } from 'mailparser';
import { describe, expect, it } from 'vitest';
import { composeDigest, digestHtml, digestText, type MorningReview } from '../../alerts/index.ts';
import { TEXT_COLUMNS, width } from '../../alerts/text.ts';
import { expectGolden } from './golden.ts';
import { GLITCH, SETTING, SITE_STEP } from './samples.ts';

const QUIET: MorningReview = {
  observatory: 'Kestrel Ridge',
  date: '2023-07-02',
  since: '2023-07-01T05:00:00Z',
  until: '2023-07-02T05:00:00Z',
  waiting: [],
  suspected: [],
  changed: [],
  quarantined: [],
  silentFeeds: [],
  silentPulsars: [],
  unlockedPulsars: [],
  intake: { files: 27, arrivals: 312, pulsars: 41 },
  limits: [
    { pulsar: 'KR 1902-08', deltaNuOverNu90: 2.13e-9, delayDays90: 6 },
    { pulsar: 'KR 2231+44', deltaNuOverNu90: 4e-8, delayDays90: 9 },
  ],
  falseAlerts: {
    budgetPerYear: 1,
    confirmed: 4,
    accepted: 2,
    rejected: 1,
    withdrawn: 0,
    falseInLastYear: 1,
    suspectedSteps: { up: 9, down: 3 },
    confirmedSteps: { up: 4, down: 0 },
  },
  heldBack: [],
  mail: { waiting: 0, oldestWaitingHours: null, undelivered: [] },
  warnings: [],
};

const BUSY: MorningReview = {
  ...QUIET,
  waiting: [GLITCH, SITE_STEP],
  suspected: [{ ...GLITCH, id: 'b', pulsar: 'KR 1902-08', state: 'suspected', confirmedAtMjd: null }],
  changed: [
    {
      event: { ...GLITCH, id: 'c', state: 'withdrawn' },
      what: 'withdrawn: later arrivals agree with the model',
      at: '2023-07-01T11:00:00Z',
    },
  ],
  quarantined: [
    {
      feed: 'ridge',
      file: 'a/b.csv',
      line: 12,
      reason: 'uncertainty_us is not a number: "<b>"',
      at: '2023-07-01T11:00:00Z',
    },
    { feed: 'ridge', file: 'a/c.csv', line: null, reason: 'not UTF-8', at: '2023-07-01T11:00:00Z' },
  ],
  silentFeeds: [{ feed: 'ridge', hoursSilent: 31, expectedHours: 24 }],
  silentPulsars: [{ pulsar: 'KR 2231+44', lastArrivalMjd: 60_100, daysSilent: 27.2 }],
  unlockedPulsars: ['KR 0001+00'],
  heldBack: [
    { event: GLITCH, why: 'held in the quiet hours until 07:00: first confirmation', at: '2023-07-02T00:10:00Z' },
  ],
  mail: {
    waiting: 1,
    oldestWaitingHours: 3,
    undelivered: [
      { subject: 'Kestrel Ridge · KR 0417+31', recipient: 'gone@kestrel-ridge.example', why: '550 unknown' },
    ],
  },
  warnings: ['the leap-second table ended on 2023-06-28'],
};

describe('the morning review', () => {
  it('says that all is quiet, what was looked at, and what would have been seen', () => {
    const text = digestText(QUIET, SETTING);
    expect(text).toContain('All quiet.');
    expect(text).toContain('312 arrivals of 41 pulsars in 27 files');
    expect(text.replace(/\s+/g, ' ')).toContain(
      'A glitch would have been confirmed with 90 % probability, in half of 2 pulsars from Δν/ν = 2.1 × 10⁻⁹ on. The blindest first: - KR 2231+44: Δν/ν = 40 × 10⁻⁹ or more, within 9.0 d - KR 1902-08: Δν/ν = 2.1 × 10⁻⁹ or more, within 6.0 d',
    );
  });

  it('says what false alerts cost so far, and what the mirror shows', () => {
    const text = digestText(QUIET, SETTING).replace(/\s+/g, ' ');
    expect(text).toContain(
      'Budget 1.0 a year, rejected or withdrawn in the last year 1; confirmed so far 4: 2 accepted, 1 rejected, 0 withdrawn, 1 without a verdict.',
    );
    expect(text).toContain('Mirror count: 3 spin-down against 9 spin-up suspected, 0 against 4 confirmed.');
  });

  it('without arrivals silence says nothing, and it does not claim quiet', () => {
    const text = digestText({ ...QUIET, intake: { files: 0, arrivals: 0, pulsars: 0 } }, SETTING);
    expect(text).toContain('No arrivals: silence says nothing.');
    expect(text).not.toMatch(/quiet/i);
  });

  it('any single thing ends the quiet', () => {
    const lists = [
      'waiting',
      'suspected',
      'changed',
      'quarantined',
      'silentFeeds',
      'silentPulsars',
      'unlockedPulsars',
      'warnings',
      'mail',
    ] as const;
    for (const name of lists) expect(digestText({ ...QUIET, [name]: BUSY[name] }, SETTING)).not.toMatch(/all quiet/i);
  });

  it('GOLDEN: a busy morning, verdicts first', () => {
    const text = digestText(BUSY, SETTING);
    for (const line of text.split('\n')) expect(width(line)).toBeLessThanOrEqual(TEXT_COLUMNS);
    expect(text.indexOf('Waits for your verdict')).toBeLessThan(text.indexOf('Site events'));
    expectGolden('digest.txt', text);
  });

  it('shows a long list in part and counts the rest', () => {
    const quarantined = Array.from({ length: 1_000 }, (_, i) => ({
      feed: 'ridge',
      file: 'a.csv',
      line: i + 1,
      reason: 'bad',
      at: QUIET.since,
    }));
    const text = digestText({ ...QUIET, quarantined }, SETTING);
    expect(text).toContain('and 975 more on the review page');
    expect(text).toContain('1000 quarantined rows');
    expect(text.length).toBeLessThan(5_000);
  });

  it('escapes what came from files', () => {
    expect(digestHtml(BUSY, SETTING)).toContain('uncertainty_us is not a number: &quot;&lt;b&gt;&quot;');
    expect(digestHtml(BUSY, SETTING)).not.toContain('<b>');
  });

  it('is one message a civil date', async () => {
    const [once, later] = [
      await composeDigest(BUSY, ['duty@kestrel-ridge.example'], SETTING),
      await composeDigest(QUIET, ['duty@kestrel-ridge.example'], { ...SETTING, now: new Date('2023-07-02T09:00:00Z') }),
    ];
    expect(once.messageId).toBe('<morning.2023-07-02@kestrel-ridge.example>');
    expect(later.messageId).toBe(once.messageId);
    const mail = await simpleParser(later.mime);
    expect(mail.subject).toBe('Kestrel Ridge · Morning review 2023-07-02: all quiet');
    expect(mail.headers.get('auto-submitted')).toBe('auto-generated');
    expect(mail.text).toContain('All quiet.');
  });
});
