import { describe, expect, test } from 'vitest';
import { createLog } from '../../daemon/log.ts';

function logged(journal: boolean, speak: (log: ReturnType<typeof createLog>) => void): string[] {
  const lines: string[] = [];
  speak(createLog({ journal, level: 'debug', write: (line) => lines.push(line) }));
  return lines;
}

describe('the log', () => {
  test('is one JSON line per fact, whatever the fields hold', () => {
    const [line, ...rest] = logged(false, (log) => log.info({ file: 'a\nb\u001b[2J\u2028c' }, 'taken in'));
    expect(rest).toEqual([]);
    expect(line?.trimEnd()).not.toMatch(/\p{Cc}/u);
    expect(JSON.parse(line ?? '')).toMatchObject({ level: 'info', file: 'a\nb\u001b[2J\u2028c', msg: 'taken in' });
  });

  test('carries the priority of sd-daemon(3) for the journal', () => {
    const lines = logged(true, (log) => {
      log.debug('d');
      log.info('i');
      log.warn('w');
      log.error('e');
      log.fatal('f');
    });
    expect(lines.map((line) => line.slice(0, 3))).toEqual(['<7>', '<6>', '<4>', '<3>', '<2>']);
  });

  test('blanks what is stored under the name of a secret', () => {
    const lines = logged(false, (log) =>
      log.info({ password: 'canary-1', mail: { pass: 'canary-2', user: 'duty' } }, 'x'),
    );
    expect(lines.join('')).not.toContain('canary');
    expect(lines.join('')).toContain('duty');
  });

  test('cuts a field that is too long', () => {
    const [line] = logged(false, (log) => log.info({ reason: 'x'.repeat(1_000_000) }, 'quarantined'));
    expect(line!.length).toBeLessThan(3000);
    expect(line).toContain('(cut)');
  });
});
