import { z } from 'zod';
import { FREQUENCY_UNITS, TIME_UNITS } from '../intake/units.ts';
import { name, oneOf, words } from './fields.ts';

/** `[feed.columns]` and its tables, one schema each: what stands where in a text table. */

const nested = z.unknown().optional();
const MOST_COLUMNS = 1000;
const LONGEST_LINE = 65_536;

const whole = (low: number, high: number) =>
  z.int().refine((value) => value >= low && value <= high, {
    error: ({ input }) => `must be a whole number between ${low} and ${high}, found ${String(input)}`,
  });
const mark = z.string().refine((text) => text.length > 0 && text.length <= 40, 'must be a text of 1 to 40 characters');
const marks = z.array(mark).default([]);
const unitOf = (units: Readonly<Record<string, unknown>>) => oneOf(Object.keys(units) as [string, ...string[]]);

export const columnsTable = z.strictObject({
  separator: z
    .string()
    .refine((text) => text.length > 0 && text.length <= 8, 'must be "blanks", "tab", or the text between two columns')
    .optional(),
  column_count: whole(1, MOST_COLUMNS).optional(),
  comment_marks: z.array(mark).default(['#']),
  skip_lines: whole(0, 10_000).default(0),
  exponent_letters: z
    .string()
    .regex(/^[A-Za-z]*$/, 'must be letters, such as "Dd"')
    .default(''),
  missing_marks: marks,
  file_name: words.optional(),
  time: nested,
  uncertainty: nested,
  frequency: nested,
  pulsar: nested,
  site: nested,
  receiver: nested,
  pulse_number: nested,
  signal_to_noise: nested,
  note: nested,
});

const characters = z.tuple([whole(1, LONGEST_LINE), whole(1, LONGEST_LINE)], {
  error: 'must be two numbers: [first, last] character of the line, counted from 1',
});

/** Where a quantity stands: one of these. */
const place = {
  column: whole(1, MOST_COLUMNS).optional(),
  characters: characters.optional(),
  fixed: z.union([words, z.number()]).optional(),
};

export const plainTable = z.strictObject(place);

export const timeTable = z.strictObject({
  column: place.column,
  characters: place.characters,
  format: oneOf(['mjd', 'jd', 'iso8601']),
  scale: oneOf(['UTC', 'TDB']).default('UTC'),
  rest_column: place.column,
  rest_characters: place.characters,
  rest_unit: oneOf(['d', 's', 'ms', 'us', 'ns', 'clock']).optional(),
});

export const uncertaintyTable = z.strictObject({ ...place, unit: unitOf(TIME_UNITS) });

export const frequencyTable = z.strictObject({ ...place, unit: unitOf(FREQUENCY_UNITS), infinite_marks: marks });

export const namedTable = z.strictObject({
  ...place,
  from_file_name: z.literal(true, { error: 'can only be true; else leave it out' }).optional(),
  names: z.record(z.string(), name, { error: 'must be a table: { "text in the file" = "our name" }' }).optional(),
});
