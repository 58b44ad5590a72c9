import { visibleText } from '../visibleText.ts';

/** Aligned columns of plain text: no borders, no colour, the same on a screen and in a pipe. */
export interface Column<Row> {
  readonly title: string;
  readonly text: (row: Row) => string;
  /** Numbers line up on the right. */
  readonly align?: 'left' | 'right';
}

/** The table as lines joined by newlines, title row first; without rows only `whenEmpty`. */
export function table<Row>(rows: readonly Row[], columns: readonly Column<Row>[], whenEmpty: string): string {
  if (rows.length === 0) return whenEmpty;
  const cells = [
    columns.map((column) => column.title),
    ...rows.map((row) => columns.map((column) => visibleText(column.text(row)))),
  ];
  const widths = columns.map((_, c) => Math.max(...cells.map((line) => displayWidth(line[c] ?? ''))));
  return cells
    .map((line) =>
      line
        .map((cell, c) => {
          const padding = ' '.repeat((widths[c] ?? 0) - displayWidth(cell));
          return columns[c]?.align === 'right' ? padding + cell : cell + padding;
        })
        .join('  ')
        .trimEnd(),
    )
    .join('\n');
}

function displayWidth(text: string): number {
  return [...text.replace(/\p{Mn}/gu, '')].length;
}
