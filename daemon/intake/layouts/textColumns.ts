/**
 * How the text tables of a feed are built: the configuration's `[feed.columns]`, checked. Columns and character positions are
 * counted from 0 here.
 */
export interface TextColumns {
  /** `blanks`: any run of blanks and tabs; a text: that text; null: fixed character positions. */
  readonly separator: 'blanks' | { readonly text: string } | null;
  /** Columns that every line has; null: any number. */
  readonly columnCount: number | null;
  /** A line that begins with one of these, behind blanks, is passed over. */
  readonly commentMarks: readonly string[];
  /** Lines at the top that are passed over. */
  readonly skipLines: number;
  /** Letters, besides e and E, that may begin the exponent of a number. */
  readonly exponentLetters: string;
  /** Texts that mean: no value. */
  readonly missingMarks: readonly string[];
  /** What the file's name must look like; null: anything. */
  readonly fileName: FileNamePattern | null;
  readonly time: TimeColumns;
  readonly uncertainty: { readonly source: Source; readonly unit: string };
  readonly frequency: {
    readonly source: Source;
    readonly unit: string;
    /** Texts that mean: dispersion was removed. */
    readonly infinite: readonly string[];
  };
  readonly pulsar: NamedSource;
  readonly site: NamedSource;
  readonly receiver: NamedSource | null;
  readonly pulseNumber: Source | null;
  readonly signalToNoise: Source | null;
  readonly note: Source | null;
}

export type Source =
  | { readonly kind: 'column'; readonly column: number }
  | { readonly kind: 'positions'; readonly from: number; readonly to: number }
  | { readonly kind: 'fixed'; readonly text: string }
  /** What stands in the file's name at a place of the pattern. */
  | { readonly kind: 'file name'; readonly place: Placeholder };

export interface NamedSource {
  readonly source: Source;
  /** The text of the file → the name that we use; null: the text is the name. A text that is not among them is refused. */
  readonly names: ReadonlyMap<string, string> | null;
}

export interface TimeColumns {
  readonly source: Source;
  /** A second column with the rest of the time; null: the first holds all of it. */
  readonly rest: { readonly source: Source; readonly unit: RestUnit } | null;
  readonly format: TimeFormat;
  readonly scale: 'UTC' | 'TDB';
}

export type TimeFormat = 'mjd' | 'jd' | 'iso8601';
/** Days; a number of seconds, ms, µs or ns since the day began; or `hh:mm:ss` behind a date. */
export type RestUnit = 'd' | 's' | 'ms' | 'us' | 'ns' | 'clock';

export const PLACEHOLDERS = ['pulsar', 'site', 'receiver'] as const;
export type Placeholder = (typeof PLACEHOLDERS)[number];

/** Texts and gaps in turn, as they follow each other in a file's name. */
export type FileNamePattern = readonly FileNamePart[];
export type FileNamePart =
  | { readonly kind: 'text'; readonly text: string }
  /** As few characters as will do, or so many; kept under a name or passed over. */
  | { readonly kind: 'gap'; readonly place: Placeholder | null; readonly length: number | null };
