import type { Terminal } from '../../daemon/commands/terminal.ts';

/** A terminal that keeps what commands write to it. */
export interface KeptTerminal extends Terminal {
  stdout(): string;
  stderr(): string;
}

export function keptTerminal(): KeptTerminal {
  let stdout = '';
  let stderr = '';
  return {
    out(text) {
      stdout += text.endsWith('\n') ? text : `${text}\n`;
    },
    err: {
      isTTY: false,
      write(text) {
        stderr += text;
      },
    },
    stdout: () => stdout,
    stderr: () => stderr,
  };
}
