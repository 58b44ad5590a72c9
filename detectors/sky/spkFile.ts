import { SECONDS_PER_DAY } from '../time/mjd.ts';
import { J2000_MJD } from './constants.ts';
import { BODY, type SpkKernel, type SpkSegment } from './spkKernel.ts';

/**
 * The file format of SPK kernels: a *double precision array file* of records of 1024 bytes (NAIF, *DAF Required Reading*) whose
 * arrays are ephemeris segments (NAIF, *SPK Required Reading*, types 2 and 3). Both byte orders.
 */

/** Bytes of a file, fetched as they are needed: kernels can be larger than memory. */
export interface ByteSource {
  readonly byteLength: number;
  /** Exactly the bytes `from` ≤ i < `to`, which lie in the file. */
  bytes(from: number, to: number): Uint8Array;
}

export interface SpkReadOptions {
  /** For messages. */
  readonly name: string;
  /** Only intervals that touch these dates are kept. */
  readonly fromMjd: number;
  readonly toMjd: number;
}

type Problem = { readonly problem: string };

const RECORD_BYTES = 1024;
const WORD_BYTES = 8;
const SUMMARY_BYTES = 40;
const CONTROL_BYTES = 24;
const MOST_SUMMARY_RECORDS = 10_000;
const LONGEST_SERIES = 100;
/** Axes of the ICRF; NAIF's number and, for history's sake, its name J2000. */
const ICRF = 1;
const WANTED: readonly number[] = [BODY.earth, BODY.earthMoonBarycentre, BODY.sun];
/** What an ASCII transfer would have changed. */
const TRANSFER_TEST = 'FTPSTR:\r:\n:\r\n:\r\0:\x81:\x10\xce:ENDFTP';

/** Reads what leads to Earth and Sun; a problem is a sentence. */
export function readSpkKernel(source: ByteSource, options: SpkReadOptions): { readonly kernel: SpkKernel } | Problem {
  const head = readHead(source);
  if ('problem' in head) return head;
  const summaries = readSummaries(source, head);
  if ('problem' in summaries) return summaries;
  const segments: SpkSegment[] = [];
  for (const summary of summaries.list) {
    if (!WANTED.includes(summary.target)) continue;
    const segment = readSegment(source, summary, head.littleEndian, options);
    if (segment !== null && 'problem' in segment) return segment;
    if (segment !== null) segments.push(segment);
  }
  for (const [body, what] of [
    [BODY.earth, 'the Earth'],
    [BODY.sun, 'the Sun'],
  ] as const) {
    if (!reachesBarycentre(segments, body)) {
      return {
        problem: `does not lead from ${what} (body ${body}) to the solar-system barycentre in the dates wanted`,
      };
    }
  }
  return { kernel: { name: options.name, segments } };
}

interface Head {
  readonly littleEndian: boolean;
  readonly firstSummaryRecord: number;
}

function readHead(source: ByteSource): Head | Problem {
  if (source.byteLength < RECORD_BYTES) return { problem: 'is shorter than the head of an SPK kernel' };
  const bytes = source.bytes(0, RECORD_BYTES);
  const kind = ascii(bytes, 0, 8);
  if (kind !== 'DAF/SPK ' && kind !== 'NAIF/DAF')
    return { problem: 'is not an SPK kernel: it does not begin with DAF/SPK' };
  const view = viewOf(bytes);
  const format = ascii(bytes, 88, 96);
  // Kernels from before the format was noted in the file tell their byte order by ND = 2.
  const littleEndian = kind === 'NAIF/DAF' ? view.getInt32(8, true) === 2 : format === 'LTL-IEEE';
  if (kind !== 'NAIF/DAF' && !littleEndian && format !== 'BIG-IEEE') {
    return { problem: `holds numbers in a format that is not IEEE 754 ("${format.trim()}")` };
  }
  if (view.getInt32(8, littleEndian) !== 2 || view.getInt32(12, littleEndian) !== 6) {
    return { problem: 'is not an SPK kernel: its summaries are not of 2 dates and 6 whole numbers' };
  }
  if (ascii(bytes, 699, 705) === 'FTPSTR' && ascii(bytes, 699, 699 + TRANSFER_TEST.length) !== TRANSFER_TEST) {
    return { problem: 'was damaged by a transfer as text: fetch it again as binary' };
  }
  return { littleEndian, firstSummaryRecord: view.getInt32(76, littleEndian) };
}

interface Summary {
  readonly startS: number;
  readonly endS: number;
  readonly target: number;
  readonly centre: number;
  readonly frame: number;
  readonly type: number;
  readonly firstWord: number;
  readonly lastWord: number;
}

function readSummaries(source: ByteSource, head: Head): { readonly list: readonly Summary[] } | Problem {
  const list: Summary[] = [];
  let record = head.firstSummaryRecord;
  for (let read = 0; record !== 0; read++) {
    const from = (record - 1) * RECORD_BYTES;
    if (
      !Number.isInteger(record) ||
      record < 2 ||
      from + RECORD_BYTES > source.byteLength ||
      read > MOST_SUMMARY_RECORDS
    ) {
      return { problem: 'is cut short or damaged: a record of its table of contents is not there' };
    }
    const view = viewOf(source.bytes(from, from + RECORD_BYTES));
    const count = view.getFloat64(16, head.littleEndian);
    if (!(count >= 0 && count <= Math.floor((RECORD_BYTES - CONTROL_BYTES) / SUMMARY_BYTES))) {
      return { problem: `is damaged: its table of contents has ${count} entries in record ${record}` };
    }
    for (let i = 0; i < count; i++) list.push(summaryAt(view, CONTROL_BYTES + i * SUMMARY_BYTES, head.littleEndian));
    record = view.getFloat64(0, head.littleEndian);
  }
  return { list };
}

function summaryAt(view: DataView, at: number, littleEndian: boolean): Summary {
  const whole = (index: number) => view.getInt32(at + 16 + 4 * index, littleEndian);
  return {
    startS: view.getFloat64(at, littleEndian),
    endS: view.getFloat64(at + 8, littleEndian),
    target: whole(0),
    centre: whole(1),
    frame: whole(2),
    type: whole(3),
    firstWord: whole(4),
    lastWord: whole(5),
  };
}

/** The part of a segment that touches the wanted dates; null: none does. */
function readSegment(
  source: ByteSource,
  summary: Summary,
  littleEndian: boolean,
  { fromMjd, toMjd }: SpkReadOptions,
): SpkSegment | Problem | null {
  const { target, centre, type, firstWord, lastWord } = summary;
  const what = `segment of body ${target}`;
  if (type !== 2 && type !== 3) return { problem: `${what}: is of SPK type ${type}; only types 2 and 3 can be used` };
  if (summary.frame !== ICRF)
    return { problem: `${what}: is in frame ${summary.frame}; only the ICRF (1) can be used` };
  if (firstWord < 1 || lastWord - firstWord < 4 || lastWord * WORD_BYTES > source.byteLength) {
    return { problem: `${what}: is not within the file, which is cut short or damaged` };
  }
  const directory = wordsAt(source, lastWord - 3, 4, littleEndian);
  const [initS, intervalS, recordWords, records] = directory as unknown as [number, number, number, number];
  const components = type === 2 ? 3 : 6;
  const terms = (recordWords - 2) / components;
  const sound =
    intervalS > 0 &&
    Number.isInteger(terms) &&
    terms >= 1 &&
    terms <= LONGEST_SERIES &&
    records >= 1 &&
    recordWords * records + 4 === lastWord - firstWord + 1 &&
    summary.startS >= initS - 1 &&
    summary.endS <= initS + records * intervalS + 1;
  if (!sound) return { problem: `${what}: its lengths do not fit together; the file is damaged` };

  const startS = Math.max(summary.startS, (fromMjd - J2000_MJD) * SECONDS_PER_DAY);
  const endS = Math.min(summary.endS, (toMjd - J2000_MJD) * SECONDS_PER_DAY);
  if (!(startS < endS)) return null;
  const first = Math.max(0, Math.floor((startS - initS) / intervalS));
  const last = Math.min(records - 1, Math.floor((endS - initS) / intervalS));
  const intervals = last - first + 1;
  const words = wordsAt(source, firstWord + first * recordWords, intervals * recordWords, littleEndian);
  const coefficients = withoutMidpoints(words, recordWords);
  if (!coefficients.every(Number.isFinite)) return { problem: `${what}: holds something that is no number` };
  const firstIntervalS = initS + first * intervalS;
  return { target, centre, startS, endS, type, firstIntervalS, intervalS, intervals, terms, coefficients };
}

/** Each record begins with the middle and the half-length of its interval, which follow from its place. */
function withoutMidpoints(words: Float64Array, recordWords: number): Float64Array {
  const length = recordWords - 2;
  const coefficients = new Float64Array((words.length / recordWords) * length);
  for (let at = 0, to = 0; at < words.length; at += recordWords, to += length) {
    coefficients.set(words.subarray(at + 2, at + recordWords), to);
  }
  return coefficients;
}

/** @param word Address as the format counts: from 1. */
function wordsAt(source: ByteSource, word: number, count: number, littleEndian: boolean): Float64Array {
  const from = (word - 1) * WORD_BYTES;
  const view = viewOf(source.bytes(from, from + count * WORD_BYTES));
  const words = new Float64Array(count);
  for (let i = 0; i < count; i++) words[i] = view.getFloat64(WORD_BYTES * i, littleEndian);
  return words;
}

function reachesBarycentre(segments: readonly SpkSegment[], body: number): boolean {
  const centres = segments.filter(({ target }) => target === body).map(({ centre }) => centre);
  return centres.some(
    (centre) =>
      centre === BODY.barycentre ||
      (centre !== body && WANTED.includes(centre) && reachesBarycentre(without(segments, body), centre)),
  );
}

function without(segments: readonly SpkSegment[], body: number): SpkSegment[] {
  return segments.filter(({ target }) => target !== body);
}

function viewOf(bytes: Uint8Array): DataView {
  return new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
}

function ascii(bytes: Uint8Array, from: number, to: number): string {
  return String.fromCharCode(...bytes.subarray(from, to));
}
