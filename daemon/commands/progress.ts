/** Where a progress bar goes: the part of `process.stderr` that it uses. */
export interface ProgressSink {
  readonly isTTY?: boolean;
  write(text: string): unknown;
}

const BAR_WIDTH = 30;

/**
 * Shows how far a long work is: one line that is redrawn on a screen, a line per 10 % anywhere else.
 * Call the result with the count done so far; at `total` it ends its line.
 */
export function progressBar(sink: ProgressSink, total: number, what: string): (done: number) => void {
  let lastShown = -1;
  return (done) => {
    const percent = total === 0 ? 100 : Math.floor((100 * done) / total);
    const shown = sink.isTTY === true ? percent : percent - (percent % 10);
    if (shown === lastShown) return;
    lastShown = shown;
    if (sink.isTTY === true) {
      const filled = Math.round((BAR_WIDTH * percent) / 100);
      const bar = '█'.repeat(filled) + '·'.repeat(BAR_WIDTH - filled);
      sink.write(`\r${bar} ${String(percent).padStart(3)} %  ${done} of ${total} ${what}${done >= total ? '\n' : ''}`);
    } else if (shown > 0 || total === 0) {
      sink.write(`${shown} %  ${done} of ${total} ${what}\n`);
    }
  };
}
