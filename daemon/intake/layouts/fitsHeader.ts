/**
 * Headers of a FITS file (FITS Standard 4.0, sections 3 and 4): 80-character cards in blocks of 2880 bytes, each followed by its data. What
 * stands in the data is nobody's business here.
 */
export interface HeaderUnit {
  /** 1 for the primary header. */
  readonly number: number;
  /** Values of the cards: texts without their quotes, everything else as written. The first of a doubled keyword counts. */
  readonly cards: ReadonlyMap<string, string>;
  readonly dataStart: number;
  /** Without the padding behind it. */
  readonly dataBytes: number;
}

export class FitsFault extends Error {
  readonly cutShort: boolean;
  constructor(message: string, { cutShort = false } = {}) {
    super(message);
    this.cutShort = cutShort;
  }
}

const BLOCK = 2880;
const CARD = 80;
const MOST_BLOCKS_OF_A_HEADER = 1000;
const MOST_AXES = 999;
const TEXT_KEYWORDS = /^(?:XTENSION|(?:TTYPE|TFORM|TUNIT|TDIM)[0-9]+)$/;
const QUOTED = /^ *'((?:[^']|'')*)'/;

/** Every header of the file in turn. Throws a `FitsFault`. */
export function* headerUnits(bytes: Buffer): Generator<HeaderUnit> {
  if (!bytes.subarray(0, 10).equals(Buffer.from('SIMPLE  = ')))
    throw new FitsFault('is not a FITS file: it does not begin with SIMPLE');
  for (let start = 0, number = 1; start < bytes.length; number += 1) {
    if (number > 1 && bytes.toString('latin1', start, start + 8) !== 'XTENSION') {
      if (isPadding(bytes, start)) return;
      throw new FitsFault(`byte ${start + 1}, HDU ${number}: does not begin with XTENSION`, {
        cutShort: bytes.length - start < 8,
      });
    }
    const { cards, end } = readHeader(bytes, start, number);
    const dataBytes = dataSize(cards, number);
    if (end + dataBytes > bytes.length) {
      const missing = end + dataBytes - bytes.length;
      throw new FitsFault(`is cut short: ${missing} bytes of the data of HDU ${number} are missing`, {
        cutShort: true,
      });
    }
    yield { number, cards, dataStart: end, dataBytes };
    start = end + Math.ceil(dataBytes / BLOCK) * BLOCK;
  }
}

/** Nothing but zeros or blanks up to the end. */
function isPadding(bytes: Buffer, start: number): boolean {
  for (let at = start; at < bytes.length; at += 1) if (bytes[at] !== 0 && bytes[at] !== 0x20) return false;
  return true;
}

function readHeader(bytes: Buffer, start: number, number: number): { cards: Map<string, string>; end: number } {
  const cards = new Map<string, string>();
  const last = start + MOST_BLOCKS_OF_A_HEADER * BLOCK;
  for (let at = start; at < last; at += CARD) {
    if (at + CARD > bytes.length) throw new FitsFault(`ends inside the header of HDU ${number}`, { cutShort: true });
    const card = bytes.toString('latin1', at, at + CARD);
    if (/[^ -~]/.test(card)) {
      throw new FitsFault(`the header of HDU ${number}, card ${(at - start) / CARD + 1}: is not plain text`);
    }
    if (card.trimEnd() === 'END') {
      const end = start + Math.ceil((at + CARD - start) / BLOCK) * BLOCK;
      if (end > bytes.length) throw new FitsFault(`ends inside the header of HDU ${number}`, { cutShort: true });
      return { cards, end };
    }
    if (card[8] !== '=' || card[9] !== ' ') continue;
    const keyword = card.slice(0, 8).trimEnd();
    const field = card.slice(10);
    if (TEXT_KEYWORDS.test(keyword) && !QUOTED.test(field)) {
      throw new FitsFault(`the header of HDU ${number}: ${keyword} is no text in quotes`);
    }
    if (!cards.has(keyword)) cards.set(keyword, cardValue(field));
  }
  throw new FitsFault(`the header of HDU ${number} is longer than ${MOST_BLOCKS_OF_A_HEADER} blocks`);
}

/** A text stands in quotes, a doubled one for one; a comment follows behind a slash. */
function cardValue(field: string): string {
  const text = QUOTED.exec(field);
  if (text !== null) return text[1]!.replaceAll("''", "'").trimEnd();
  return field.split('/', 1)[0]!.trim();
}

/** Section 4.4.1: |BITPIX|/8 × GCOUNT × (PCOUNT + the product of the axes). */
function dataSize(cards: ReadonlyMap<string, string>, number: number): number {
  const axes = wholeCard(cards, 'NAXIS', { number, most: MOST_AXES });
  const bitsPerValue = Number(/^-?(8|16|32|64)$/.exec(cards.get('BITPIX') ?? '')?.[1] ?? Number.NaN);
  if (Number.isNaN(bitsPerValue)) throw new FitsFault(`HDU ${number}: BITPIX is not one of 8, 16, 32, 64, -32, -64`);
  if (axes === 0) return 0;
  let values = 1;
  for (let axis = 1; axis <= axes; axis += 1) values *= wholeCard(cards, `NAXIS${axis}`, { number });
  const groups = cards.has('GCOUNT') ? wholeCard(cards, 'GCOUNT', { number }) : 1;
  const heap = cards.has('PCOUNT') ? wholeCard(cards, 'PCOUNT', { number }) : 0;
  const size = (bitsPerValue / 8) * groups * (heap + values);
  if (!Number.isSafeInteger(size)) throw new FitsFault(`HDU ${number}: its size is beyond all bounds`);
  return size;
}

/** A count; complains with the card's name. */
export function wholeCard(
  cards: ReadonlyMap<string, string>,
  keyword: string,
  { number, most = Number.MAX_SAFE_INTEGER }: { readonly number: number; readonly most?: number },
): number {
  const text = cards.get(keyword);
  const value = text !== undefined && /^\+?[0-9]{1,15}$/.test(text) ? Number(text) : Number.NaN;
  if (value <= most) return value;
  throw new FitsFault(`HDU ${number}: ${keyword} ${text === undefined ? 'is missing' : `= ${text} is not a count`}`);
}
