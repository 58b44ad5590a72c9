import type { WatchProblem } from './feedLook.ts';

/**
 * Says once when a problem begins and once when it is over, however often it is seen. A listener that throws must not end the watch:
 * it is told again at the next update.
 */
export interface ProblemLedger {
  /** All that is wrong now. */
  update(problems: readonly WatchProblem[]): void;
  current(): readonly WatchProblem[];
}

export function createProblemLedger(
  onProblem: (problem: WatchProblem) => void,
  onProblemEnded: (problem: WatchProblem) => void,
): ProblemLedger {
  let current = new Map<string, WatchProblem>();
  return {
    update(problems) {
      const now = new Map(problems.map((problem) => [identityOf(problem), problem]));
      const ended = [...current].filter(([id]) => !now.has(id));
      const begun = [...now].filter(([id]) => !current.has(id));
      current = now;
      for (const [id, problem] of begun) if (!isTold(onProblem, problem)) current.delete(id);
      for (const [id, problem] of ended) if (!isTold(onProblemEnded, problem)) current.set(id, problem);
    },
    current: () => [...current.values()],
  };
}

function isTold(listener: (problem: WatchProblem) => void, problem: WatchProblem): boolean {
  try {
    listener(problem);
    return true;
  } catch {
    return false;
  }
}

function identityOf({ kind, path, message }: WatchProblem): string {
  return JSON.stringify([kind, path, message]);
}
