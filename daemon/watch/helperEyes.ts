import type { ChildProcess } from 'node:child_process';
import { startHelper } from '../helperProcess.ts';
import { type FolderEyes, NoAnswer, type OpenEyes } from './folderEyes.ts';
import type { Reading, Wanted } from './open.ts';
import type { FoundFile, Scan } from './scan.ts';

/**
 * Eyes in a process of their own, one a feed: a mount that hangs holds that process and nothing of the daemon. One that is silent for too long is
 * killed. A process that waits in the system for a dead server goes only when that answers; until then the feed has no eyes, and nobody piles up.
 */
export type Question =
  | { readonly kind: 'scan'; readonly folder: string; readonly recursive: boolean }
  | { readonly kind: 'read'; readonly wanted: Wanted; readonly largestBytes: number };

export type Answer =
  | { readonly kind: 'at work' }
  | { readonly kind: 'files'; readonly files: readonly FoundFile[] }
  | { readonly kind: 'answer'; readonly answer: Scan | Reading };

/** Without a word for so long a file system hangs. */
const PATIENCE_MS = 60_000;

export function helperEyes(patienceMs = PATIENCE_MS): OpenEyes {
  return ({ folder, recursive }, largestBytes): FolderEyes => {
    const ask = createHelper(patienceMs);
    return {
      async scan() {
        const files: FoundFile[] = [];
        const scan = (await ask({ kind: 'scan', folder, recursive }, files)) as Scan;
        return scan.kind === 'listed' ? { ...scan, files } : scan;
      },
      async read(wanted) {
        try {
          return (await ask({ kind: 'read', wanted, largestBytes })) as Reading;
        } catch (error) {
          return { kind: 'later', reason: (error as Error).message, quiet: false };
        }
      },
      close: ask.close,
    };
  };
}

interface Ask {
  /** @param files where those go that come before the answer */
  (question: Question, files?: FoundFile[]): Promise<Scan | Reading>;
  close(): void;
}

/** Starts the process at the first question, and again at the next after it ended. */
function createHelper(patienceMs: number): Ask {
  let helper: ChildProcess | null = null;
  let isSilent = false;
  const begin = (): ChildProcess => {
    const begun = startHelper('folderHelper', import.meta.url);
    begun.once('exit', () => {
      helper = null;
      isSilent = false;
    });
    return begun;
  };
  const ask = async (question: Question, files: FoundFile[] = []) => {
    if (isSilent) throw new NoAnswer(SILENT);
    helper ??= begin();
    return answerOf(helper, question, {
      files,
      patienceMs,
      onSilence(asked) {
        isSilent = true;
        asked.kill('SIGKILL');
      },
    });
  };
  return Object.assign(ask, { close: () => void helper?.kill('SIGKILL') });
}

const SILENT = 'does not answer (a mount that hangs?); the other feeds go on';

interface Listening {
  readonly files: FoundFile[];
  readonly patienceMs: number;
  readonly onSilence: (asked: ChildProcess) => void;
}

function answerOf(
  asked: ChildProcess,
  question: Question,
  { files, patienceMs, onSilence }: Listening,
): Promise<Scan | Reading> {
  return new Promise((resolve, reject) => {
    const end = () => {
      clearTimeout(timer);
      asked.off('message', onMessage).off('exit', onExit).off('error', onError);
    };
    const onMessage = (message: Answer) => {
      timer.refresh();
      if (message.kind === 'files') files.push(...message.files);
      if (message.kind !== 'answer') return;
      end();
      resolve(message.answer);
    };
    const onError = (error: Error) => {
      end();
      reject(error);
    };
    const onExit = () => onError(new Error('the process that looks at the folder ended'));
    const timer = setTimeout(() => {
      onSilence(asked);
      onError(new NoAnswer(SILENT));
    }, patienceMs);
    asked.on('message', onMessage).on('exit', onExit).on('error', onError);
    asked.send(question, (error) => {
      if (error !== null) onError(error);
    });
  });
}
