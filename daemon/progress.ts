import type { Clock } from './clock.ts';

/**
 * Which parts of the daemon still make progress. Each says so itself, at every step; one that has said nothing for longer than its limit
 * while it has something in hand is stuck or dead, and then nothing else may claim that the watch is alive.
 */
export interface Progress {
  /** The same name is the same stage. */
  stage(name: string, limitMs: number): Stage;
  stages(): readonly StageStatus[];
  /** Names of those that are late. */
  late(): readonly string[];
}

export interface Stage {
  /** Work went on. */
  step(): void;
  /** Nothing is in hand: until the next step no progress is expected. */
  rest(): void;
}

export interface StageStatus {
  readonly name: string;
  readonly resting: boolean;
  readonly sinceMs: number;
  readonly limitMs: number;
  readonly late: boolean;
}

interface Entry {
  readonly limitMs: number;
  lastMs: number;
  resting: boolean;
}

export function createProgress(clock: Pick<Clock, 'monotonicMs'>): Progress {
  const entries = new Map<string, Entry>();
  const stages = () =>
    [...entries].map(([name, { limitMs, lastMs, resting }]) => {
      const sinceMs = clock.monotonicMs() - lastMs;
      return { name, resting, sinceMs, limitMs, late: !resting && sinceMs > limitMs };
    });
  return {
    stage(name, limitMs) {
      const entry: Entry = { limitMs, lastMs: clock.monotonicMs(), resting: false };
      entries.set(name, entry);
      return {
        step() {
          entry.lastMs = clock.monotonicMs();
          entry.resting = false;
        },
        rest() {
          entry.lastMs = clock.monotonicMs();
          entry.resting = true;
        },
      };
    },
    stages,
    late: () => stages().flatMap(({ name, late }) => (late ? [name] : [])),
  };
}
