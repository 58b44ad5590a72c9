import { slowDecimal } from './slowCsv.ts';

// FITS, VOTable and blank-separated text once more, in the plainest way and sharing no code with the program: the cells of one row by its
// number, for files such as test/support/mutatedLayouts.ts makes. Texts as they stand; numbers as JavaScript reads them.

export interface SlowRow {
  readonly pulsar: string;
  readonly mjd: string;
  readonly uncertaintyUs: number;
  readonly frequencyMhz: number;
  readonly site: string;
}

const NAMES = ['pulsar', 'mjd_utc', 'uncertainty_us', 'frequency_mhz', 'site'];

/** @param row counted from 1 */
export function slowFitsRow(bytes: Buffer, row: number): SlowRow | null {
  const text = bytes.toString('latin1');
  let start = 2880;
  while (start < text.length && !text.startsWith('XTENSION', start)) start += 2880;
  const cards: string[] = [];
  let at = start;
  for (; at < text.length && text.slice(at, at + 80).trim() !== 'END'; at += 80) cards.push(text.slice(at, at + 80));
  const value = (key: string) =>
    cards
      .find((line) => line.startsWith(`${key.padEnd(8)}= `))
      ?.slice(10)
      .trim() ?? '';
  const data = start + Math.ceil((at + 80 - start) / 2880) * 2880;
  let place = data + (row - 1) * Number.parseInt(value('NAXIS1'), 10);
  const cells = new Map<string, string | number>();
  for (let n = 1; n <= Number.parseInt(value('TFIELDS'), 10); n += 1) {
    const name = value(`TTYPE${n}`).split("'")[1]!.trim().toLowerCase();
    const [, count = '', code = ''] = /^'\s*(\d*)([A-Z])/.exec(value(`TFORM${n}`)) ?? [];
    const repeat = count === '' ? 1 : Number(count);
    if (code === 'A') {
      const field = bytes.subarray(place, place + repeat).toString('utf8');
      cells.set(name, field.split('\0')[0]!.replace(/^ */, '').replace(/ *$/, ''));
    } else if (code === 'D') cells.set(name, bytes.readDoubleBE(place));
    else if (code === 'E') cells.set(name, bytes.readFloatBE(place));
    else if (code === 'J') cells.set(name, bytes.readInt32BE(place));
    else if (code === 'I') cells.set(name, bytes.readInt16BE(place));
    else if (code === 'B') cells.set(name, bytes.readUInt8(place));
    const width = { A: 1, B: 1, L: 1, I: 2, J: 4, E: 4, K: 8, D: 8, C: 8, P: 8, M: 16, Q: 16 }[code] ?? 0;
    place += code === 'X' ? Math.ceil(repeat / 8) : repeat * width;
  }
  return NAMES.every((name) => cells.has(name)) ? slowRow(NAMES.map((name) => cells.get(name)!)) : null;
}

export function slowVotableRow(text: string, row: number): SlowRow | null {
  const plain = text.replace(/<!--[\s\S]*?-->|<\?[\s\S]*?\?>/g, '');
  const names = [...plain.matchAll(/<FIELD\s[^>]*?name\s*=\s*["']([^"']*)["']/g)].map(([, name]) => name!.trim());
  const tr = [...plain.matchAll(/<TR(?:\s[^>]*)?>([\s\S]*?)<\/TR\s*>/g)][row - 1]?.[1];
  if (tr === undefined) return null;
  const cells = [...tr.matchAll(/<TD(?:\s[^>]*)?(?:\/>|>([\s\S]*?)<\/TD\s*>)/g)].map(([, cell = '']) =>
    cell
      .replace(/&(?:#x([0-9a-fA-F]+)|#([0-9]+)|(lt|gt|amp|quot|apos));/g, (_, hex, decimal, name) =>
        name === undefined
          ? String.fromCodePoint(hex === undefined ? Number(decimal) : Number.parseInt(hex, 16))
          : { lt: '<', gt: '>', amp: '&', quot: '"', apos: "'" }[name as 'lt'],
      )
      .replace(/\r\n?/g, '\n')
      .replace(/^[ \t\n]*/, '')
      .replace(/[ \t\n]*$/, ''),
  );
  return cells.length === names.length ? slowRow(NAMES.map((name) => cells[names.indexOf(name)] ?? '')) : null;
}

/** Pulsar, date, uncertainty in µs and frequency in MHz, with D for an exponent; the site is always the ridge. */
export function slowTextRow(text: string, line: number): SlowRow | null {
  const fields = text
    .split('\n')
    [line - 1]?.replace(/\r$/, '')
    .split(/[ \t]/)
    .filter((field) => field !== '');
  if (fields === undefined || fields.length < 4) return null;
  const [pulsar, mjd, uncertainty, frequency] = fields.map((field, i) => (i > 1 ? field.replace(/[dD]/, 'e') : field));
  return slowRow([pulsar!, mjd!, uncertainty!, frequency!, 'ridge']);
}

function slowRow([pulsar, mjd, uncertainty, frequency, site]: readonly (string | number)[]): SlowRow {
  return {
    pulsar: `${pulsar}`,
    mjd: `${mjd}`,
    uncertaintyUs: Number(uncertainty),
    frequencyMhz: frequency === 'inf' ? Number.POSITIVE_INFINITY : Number(frequency),
    site: `${site}`,
  };
}

/** In units of 10⁻³⁰ d; null: not a number. A D may begin the exponent. */
export function slowMjd(text: string): bigint | null {
  const [, sign, whole = '', fraction = '', power = ''] = /^(\+?)(\d*)\.?(\d*)(?:[eEdD]([+-]?\d+))?$/.exec(text) ?? [];
  if (sign === undefined || whole + fraction === '') return null;
  return slowDecimal(`${whole || '0'}.${fraction || '0'}${power === '' ? '' : `e${power}`}`);
}
