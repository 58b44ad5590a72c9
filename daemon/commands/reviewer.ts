import { createInterface } from 'node:readline';
import { Writable } from 'node:stream';
import { closestName } from '../closestName.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { loadOrders } from '../opening.ts';
import { hashPassword, passwordProblem, writePasswordEntry } from '../review/access/passwords.ts';
import { openStore } from '../store/index.ts';
import type { Terminal } from './terminal.ts';

export interface ReviewerOptions {
  readonly config: string;
  readonly remove?: boolean;
}

/** `reviewer`: sets the password of one of the configured reviewers, or takes it away. What sessions they have end. */
export async function reviewer(terminal: Terminal, name: string, { config, remove }: ReviewerOptions): Promise<void> {
  const { configuration } = loadOrders(config);
  const { reviewers, passwordFile } = configuration.review;
  if (!reviewers.includes(name) && !remove) throw unknown(name, reviewers);
  const password = remove ? null : await askTwice(terminal, name);
  const problem = password === null ? null : passwordProblem(password);
  if (problem !== null) throw wrongUsage(problem);
  const failed = writePasswordEntry(passwordFile, name, password === null ? null : await hashPassword(password));
  if (failed !== null) throw new OperatorError(failed.problem, { exitCode: EXIT.workFailed });
  endSessions(configuration.stateFolder, name);
  terminal.out(remove ? `${name} has no password any more.` : `The password of ${name} is set (${passwordFile}).`);
}

function unknown(name: string, reviewers: readonly string[]): OperatorError {
  const near = closestName(name, reviewers);
  const known = reviewers.length === 0 ? 'names none' : `names ${reviewers.join(', ')}`;
  return wrongUsage(
    `${name} is no reviewer: [review] reviewers ${known}${near === null ? '' : `; did you mean ${near}?`}`,
  );
}

function wrongUsage(message: string): OperatorError {
  return new OperatorError(message, { exitCode: EXIT.wrongUsage });
}

/** Before the first start there is no record, and nobody is logged in. */
function endSessions(stateFolder: string, name: string): void {
  const opened = openStore(stateFolder, { mode: 'reader' });
  if (!opened.ok) return;
  try {
    opened.store.endSessionsOf(name);
  } finally {
    opened.store.close();
  }
}

/** From a terminal twice, unseen; else the first line of what is piped in. */
async function askTwice({ err }: Terminal, name: string): Promise<string> {
  if (!process.stdin.isTTY) return (await linesFrom(1))[0] ?? '';
  err.write(`New password of ${name}, then once more (nothing is shown):\n`);
  const [first = '', second = ''] = await linesFrom(2);
  if (first !== second) throw wrongUsage('the two passwords differ; nothing was changed');
  return first;
}

async function linesFrom(most: number): Promise<string[]> {
  const nowhere = new Writable({ write: (_chunk, _encoding, done) => done() });
  const reader = createInterface({ input: process.stdin, output: nowhere, terminal: process.stdin.isTTY });
  const lines: string[] = [];
  for await (const line of reader) {
    lines.push(line);
    if (lines.length === most) break;
  }
  reader.close();
  process.stdin.pause();
  return lines;
}
