import type { Answer, Question } from './helperEyes.ts';
import { readStill } from './open.ts';
import { scanFolder } from './scan.ts';

/** The other side of `helperEyes`: looks at one feed's folder and says what it sees. It ends with the daemon, and not by the signals that end that. */

const FILES_A_MESSAGE = 1000;

async function answer(question: Question): Promise<void> {
  if (question.kind === 'read') {
    say({ kind: 'answer', answer: await readStill(question.wanted, { largestBytes: question.largestBytes }) });
    return;
  }
  const scan = await scanFolder(question.folder, {
    recursive: question.recursive,
    onProgress: () => say({ kind: 'at work' }),
  });
  if (scan.kind === 'root gone') {
    say({ kind: 'answer', answer: scan });
    return;
  }
  for (let from = 0; from < scan.files.length; from += FILES_A_MESSAGE) {
    say({ kind: 'files', files: scan.files.slice(from, from + FILES_A_MESSAGE) });
  }
  say({ kind: 'answer', answer: { ...scan, files: [] } });
}

function say(message: Answer): void {
  if (process.connected) process.send?.(message);
}

for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP'] as const) process.on(signal, () => {});
process.on('message', (question: Question) => void answer(question));
