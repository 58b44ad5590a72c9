import { z } from 'zod';
import { LONGEST_NAME } from '../intake/arrivalFields.ts';
import { hasHiddenCharacters } from '../visibleText.ts';

/** The kinds of value that stand in our configuration files, with complaints in words. */

const ADDRESS = /^[^\s@<>()[\],;:\\"]+@[^\s@<>()[\],;:\\"]+$/;

const visible = (longest: number) =>
  z
    .string()
    .refine((text) => text.trim() !== '', 'must not be empty')
    .refine((text) => text.length <= longest, `must not be longer than ${longest} characters`)
    .refine((text) => !hasHiddenCharacters(text), 'must not hold control or invisible characters');

export const name = visible(LONGEST_NAME).refine((text) => text.trim() === text, 'must not begin or end with a space');
export const words = visible(200);
export const path = visible(4096);

export const mailAddress = z
  .string()
  .refine(
    (text) => ADDRESS.test(text) && !hasHiddenCharacters(text),
    'must be a plain mail address such as duty@example.org',
  );

/** A number within bounds; `unit` is said in the complaint, so that a value in another unit is understood at once. */
export function numberBetween(low: number, high: number, unit: string) {
  return z.number().refine((value) => value >= low && value <= high, {
    error: ({ input }) => `must be between ${low} and ${high}${unit === '' ? '' : ` ${unit}`}, found ${String(input)}`,
  });
}

export function oneOf<const Values extends readonly [string, ...string[]]>(values: Values) {
  return z.enum(values, {
    error: ({ input }) =>
      `must be one of ${values.map((value) => `"${value}"`).join(', ')}, found ${JSON.stringify(input)}`,
  });
}

/** Numbers whose digits matter: a text or a TOML number, whose text the reader keeps. */
export const digits = z.union([z.string(), z.number()], {
  error: 'must be a number, best in quotes so that no digit is lost',
});
