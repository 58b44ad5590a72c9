import { parseDoubleDouble } from '../../detectors/spin/doubleDouble.ts';
import type { DoubleDouble } from '../../detectors/spin/pulsarModel.ts';
import { type Mjd, parseMjd } from '../../detectors/time/mjd.ts';
import { parseDecimal } from '../intake/numbers.ts';
import type { SectionReader } from './sectionReader.ts';
import type { TomlPath } from './tomlDocument.ts';

/**
 * The numbers of a pulsar's file, read from their digits. Each is null after a complaint; where a value that has to be there is missing,
 * the section's schema complains.
 */

export interface Bounds {
  readonly low: number;
  readonly high: number;
  readonly unit: string;
  /** Taken where the key is absent. */
  readonly absent?: number;
}

export function numberWithin(
  reader: SectionReader,
  path: TomlPath,
  { low, high, unit, absent }: Bounds,
): number | null {
  const text = reader.document.textOf(path);
  if (text === null) return absent ?? null;
  const value = parseDecimal(text);
  if (value !== null && value >= low && value <= high) return value;
  reader.error(path, `must be a number between ${low} and ${high}${unit === '' ? '' : ` ${unit}`}, found "${text}"`);
  return null;
}

/** A number of either sign. */
export function decimal(
  reader: SectionReader,
  path: TomlPath,
  { size, ...rest }: { readonly size: number; readonly unit: string; readonly absent?: number },
): number | null {
  return numberWithin(reader, path, { low: -size, high: size, ...rest });
}

export function date(reader: SectionReader, path: TomlPath): Mjd | null {
  const text = reader.document.textOf(path);
  if (text === null) return null;
  const mjd = parseMjd(text);
  if (mjd !== null && mjd.day >= 30_000 && mjd.day <= 100_000) return mjd;
  reader.error(path, `must be a Modified Julian Date between 30000 and 100000, found "${text}"`);
  return null;
}

/** Slowest known pulsars turn in minutes, the fastest 716 times a second (common practice, no source). */
export function frequency(reader: SectionReader, path: TomlPath): DoubleDouble | null {
  const text = reader.document.textOf(path);
  if (text === null) return null;
  const rough = parseDecimal(text);
  if (rough !== null && rough >= 1e-4 && rough <= 2000) return parseDoubleDouble(text);
  reader.error(path, `must be between 0.0001 and 2000 Hz (the frequency, not the period), found "${text}"`);
  return null;
}
