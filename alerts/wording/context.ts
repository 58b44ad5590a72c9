import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { mjdText } from './dates.ts';
import { NOT_CONSTRAINED, plain, quantity } from './numbers.ts';
import type { SheetRow } from './sheet.ts';

const MOST_SIZES = 5;

/** What the event stands beside, for the reviewer; nothing for events of other kinds. */
export function contextRows({ context }: PulsarEvent): SheetRow[] {
  if (context === undefined) return [];
  const { characteristicAgeYears: age, waitedDays, earlierGlitches, brakingIndex, typical } = context;
  const rows: SheetRow[] = [];
  if (age !== null) rows.push({ label: 'Characteristic age', value: `${plain(age / 1000, 3)} kyr` });
  if (waitedDays === null) rows.push({ label: 'Earlier glitches', value: 'none on record' });
  else {
    const sizes = earlierGlitches
      .slice(-MOST_SIZES)
      .map((g) => `${power(g.deltaNuOverNu)} at ${mjdText(g.epochMjd)}`)
      .join(', ');
    const more = earlierGlitches.length > MOST_SIZES ? ` and ${earlierGlitches.length - MOST_SIZES} before` : '';
    rows.push({ label: 'Since the last glitch', value: `${plain(waitedDays, 4)} d` });
    rows.push({ label: 'Earlier Δν/ν', value: `${sizes}${more}` });
    rows.push({
      label: 'Braking index before it',
      value:
        brakingIndex === null
          ? NOT_CONSTRAINED
          : `n = ${quantity({ value: brakingIndex.value, interval68: brakingIndex.interval68, unit: '', scale: 'power' })}`,
    });
  }
  for (const { text, source } of typical) rows.push({ label: 'Published', value: `${text} (${source})` });
  return rows;
}

/** To the digits of a list, without its uncertainty. */
function power(value: number): string {
  return quantity({ value, interval68: [value, value], unit: '', scale: 'power' });
}
