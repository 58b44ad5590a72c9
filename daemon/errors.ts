/** What the shell learns from the program: the whole list. */
export const EXIT = {
  done: 0,
  workFailed: 1,
  wrongUsage: 2,
  anotherInstance: 3,
} as const;
export type ExitCode = (typeof EXIT)[keyof typeof EXIT];

/**
 * An error that an operator can act on: what happened and where (`message`), and what to do about it (`advice`). The command line prints it as one
 * line and ends with its exit code; anything else that is thrown is a fault of ours and is printed with its stack.
 */
export class OperatorError extends Error {
  readonly exitCode: ExitCode;
  readonly advice: string | null;

  constructor(message: string, options: { exitCode: ExitCode; advice?: string; cause?: unknown }) {
    super(message, { cause: options.cause });
    this.name = 'OperatorError';
    this.exitCode = options.exitCode;
    this.advice = options.advice ?? null;
  }
}

/** The words of anything that was thrown, on one line. */
export function reasonOf(thrown: unknown): string {
  const words = thrown instanceof Error ? thrown.message : String(thrown);
  return words.replace(/\s+/gu, ' ').trim();
}
