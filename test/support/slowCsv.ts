/**
 * RFC 4180 once more, letter by letter and sharing no code with the program: the fields of the record that begins at an offset,
 * and where it ends. Null: not a record.
 */
export function slowRecordAt(text: string, offset: number): { readonly fields: string[]; readonly end: number } | null {
  const fields: string[] = [];
  let field = '';
  let state: 'start' | 'plain' | 'inside' | 'quote seen' = 'start';
  for (let at = offset; ; at += 1) {
    const letter = text[at];
    const ends =
      letter === undefined || letter === '\n' || (letter === '\r' && (text[at + 1] === '\n' || at + 1 === text.length));
    if (state === 'inside') {
      if (letter === undefined) return null;
      if (letter === '"') state = 'quote seen';
      else if (!(letter === '\r' && text[at + 1] === '\n')) field += letter;
    } else if (state === 'quote seen' && letter === '"') {
      field += '"';
      state = 'inside';
    } else if (letter === ',' || ends) {
      fields.push(field.replace(/^[ \t]*/, '').replace(/[ \t]*$/, ''));
      if (ends) return { fields, end: at };
      field = '';
      state = 'start';
    } else if (letter === '"') {
      if (state !== 'start') return null;
      state = 'inside';
    } else if (state === 'quote seen') {
      if (letter !== ' ' && letter !== '\t') return null;
    } else {
      field += letter;
      state = 'plain';
    }
  }
}

/** A decimal text as a whole number of units of 10⁻³⁰; null when it is none. */
export function slowDecimal(text: string): bigint | null {
  const match = /^([+-]?)(\d+)(?:\.(\d+))?(?:[eE]([+-]?\d+))?$/.exec(text);
  if (match === null) return null;
  const digits = `${match[2]}${match[3] ?? ''}`;
  const shift = 30 + Number(match[4] ?? '0') - (match[3] ?? '').length;
  if (Math.abs(shift) > 1000) return null;
  const size = shift >= 0 ? BigInt(digits) * 10n ** BigInt(shift) : BigInt(digits) / 10n ** BigInt(-shift);
  return match[1] === '-' ? -size : size;
}
