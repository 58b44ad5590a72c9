import { describe, expect, test } from 'vitest';
import { progressBar } from '../../daemon/commands/progress.ts';
import { table } from '../../daemon/commands/table.ts';

describe('a table', () => {
  const columns = [
    { title: 'pulsar', text: (row: { name: string; n: number }) => row.name },
    { title: 'arrivals', text: (row: { name: string; n: number }) => String(row.n), align: 'right' as const },
  ];

  test('lines up names on the left and numbers on the right', () => {
    const rows = [
      { name: 'KR 0417+31', n: 7 },
      { name: 'KR 1', n: 12345 },
    ];
    expect(table(rows, columns, 'none')).toBe('pulsar      arrivals\nKR 0417+31         7\nKR 1           12345');
  });

  test('says so when there is nothing', () => expect(table([], columns, 'No events.')).toBe('No events.'));

  test('lets no name from outside move the cursor or start a line', () => {
    const text = table([{ name: '\u001b[2Jx\ny\u202e', n: 1 }], columns, '');
    expect(text.split('\n')).toHaveLength(2);
    expect(text).toContain('\\u{1b}[2Jx\\u{a}y\\u{202e}');
  });
});

describe('a progress bar', () => {
  const shown = (isTTY: boolean, steps: readonly number[], total: number) => {
    let text = '';
    const show = progressBar({ isTTY, write: (more: string) => (text += more) }, total, 'files');
    for (const step of steps) show(step);
    return text;
  };

  test('is one line on a screen', () => {
    const text = shown(true, [0, 1, 2], 2);
    expect(text.match(/\r/g)).toHaveLength(3);
    expect(text.match(/\n/g)).toHaveLength(1);
    expect(text).toContain('100 %  2 of 2 files');
  });

  test('is a line per 10 % elsewhere', () => {
    const text = shown(
      false,
      Array.from({ length: 101 }, (_, i) => i),
      100,
    );
    expect(text.split('\n').filter(Boolean)).toHaveLength(10);
    expect(text).not.toContain('\r');
  });
});
