import { z } from 'zod';
import { DEFAULT_HISTORICAL_DAYS, DEFAULT_HOURLY_CAP, DEFAULT_SHARPER_BY } from '../../alerts/index.ts';
import { EXPLANATIONS } from '../../detectors/steps/pulsarEvent.ts';
import { LAYOUTS } from '../intake/layouts/read.ts';
import { cronProblem } from './cronText.ts';
import { mailAddress, name, numberBetween, oneOf, path, words } from './fields.ts';

/** The sections of `spinvigil.toml`, one schema each. */

const nested = z.unknown().optional();

export const rootTable = z.strictObject({
  observatory: nested,
  state: nested,
  earth: nested,
  site: nested,
  feed: nested,
  models: nested,
  budget: nested,
  mail: nested,
  review: nested,
  heartbeat: nested,
});

export const observatoryTable = z.strictObject({ name: words, contact: words });

export const stateTable = z.strictObject({ folder: path });

export const earthTable = z.strictObject({
  orientation_file: path.optional(),
  kernel_file: path.optional(),
  tt_bipm_file: path.optional(),
});

export const siteTable = z.strictObject({
  name,
  itrf_m: z.tuple([z.number(), z.number(), z.number()], { error: 'must be three numbers: [x, y, z] in metres' }),
  clock_table: path.optional(),
});

export const feedTable = z.strictObject({
  name,
  folder: path,
  layout: oneOf(LAYOUTS),
  columns: nested,
  recursive: z.boolean().default(false),
  poll_seconds: numberBetween(0.1, 86_400, 's').optional(),
  expect_every_hours: numberBetween(0.01, 100_000, 'h').optional(),
});

export const modelsTable = z.strictObject({ folder: path, write_folder: path.optional() });

export const budgetTable = z.strictObject({ false_alerts_per_year: numberBetween(1e-6, 1000, 'per year') });

const HOURS_OF_DAY = /^([01]\d|2[0-3]):[0-5]\d-([01]\d|2[0-3]):[0-5]\d$/;

export const mailTable = z.strictObject({
  transport: oneOf(['smtp', 'folder']),
  folder: path.optional(),
  host: z
    .string()
    .regex(/^[A-Za-z0-9_.:-]+$/, 'must be a host name or an address')
    .optional(),
  port: z
    .int()
    .refine((port) => port >= 1 && port <= 65_535, 'must be a whole number between 1 and 65535')
    .optional(),
  secure: oneOf(['tls', 'starttls', 'none']).optional(),
  user: words.optional(),
  password_file: path.optional(),
  from: mailAddress,
  to: z.array(mailAddress).min(1, 'must name at least one recipient'),
  timezone: z.string().refine(isTimeZone, {
    error: ({ input }) => `"${String(input)}" is not a time zone; write an IANA name such as "Europe/Berlin" or "UTC"`,
  }),
  historical_after_days: numberBetween(1, 1_000_000, 'd').default(DEFAULT_HISTORICAL_DAYS),
  update_when_sharper_by: numberBetween(1.1, 1000, '(a factor)').default(DEFAULT_SHARPER_BY),
  mail_suspected: z.boolean().default(false),
  quiet_hours: z
    .string()
    .regex(HOURS_OF_DAY, 'must be two times of day such as "22:00-07:00"')
    .refine((hours) => hours.slice(0, 5) !== hours.slice(6), 'must not begin and end at the same time')
    .optional(),
  quiet_hours_except_above: numberBetween(0, 1, '(Δν/ν)').optional(),
  most_per_hour: z
    .int()
    .refine((count) => count >= 1 && count <= 1000, 'must be a whole number between 1 and 1000')
    .default(DEFAULT_HOURLY_CAP),
  also_to: nested,
  digest_cron: z.string().superRefine((text, context) => {
    const problem = cronProblem(text);
    if (problem !== null) context.addIssue({ code: 'custom', message: problem });
  }),
});

export const alsoToTable = z.strictObject({
  to: z.array(mailAddress).min(1, 'must name at least one recipient'),
  explanations: z.array(oneOf(EXPLANATIONS)).default([]),
  pulsars: z.array(name).default([]),
});

export const reviewTable = z.strictObject({
  listen: z.string().default('127.0.0.1:8417'),
  reviewers: z.array(name).default([]),
  password_file: path.optional(),
  tls_certificate_file: path.optional(),
  tls_key_file: path.optional(),
  behind_proxy: z
    .string()
    .refine(isOrigin, 'must be the address that browsers use, without a path, such as "https://watch.example.org"')
    .optional(),
  proxy_address: z.array(z.string()).min(1, 'must name at least one IP address').optional(),
  monitor_token_file: path.optional(),
});

const heartbeatUrl = z
  .string()
  .refine(
    isWebAddress,
    'must be an http or https address without user name, such as "https://alive.example.org/watch"',
  );

export const heartbeatTable = z.strictObject({
  url: heartbeatUrl.optional(),
  mail_blocked_url: heartbeatUrl.optional(),
  every_minutes: numberBetween(1, 1440, 'minutes').default(5),
  mail_to: z.array(mailAddress).min(1, 'must name at least one recipient').optional(),
  mail_every_hours: numberBetween(0.1, 1000, 'h').default(6),
});

function isOrigin(text: string): boolean {
  const url = URL.parse(text);
  return url !== null && (url.protocol === 'https:' || url.protocol === 'http:') && url.origin === text;
}

function isWebAddress(text: string): boolean {
  const url = URL.parse(text);
  if (url === null || !['http:', 'https:'].includes(url.protocol)) return false;
  return url.username === '' && url.password === '' && url.hash === '' && !/[\s\p{Cc}]/u.test(text);
}

function isTimeZone(text: string): boolean {
  if (!/^[A-Za-z]/.test(text)) return false;
  try {
    new Intl.DateTimeFormat('en', { timeZone: text });
    return true;
  } catch {
    return false;
  }
}
