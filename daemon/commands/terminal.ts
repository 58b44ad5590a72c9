/** Where a command writes: what was asked for, and what is said beside it. */
export interface Terminal {
  out(text: string): void;
  readonly err: { readonly isTTY?: boolean; write(text: string): unknown };
}

export const processTerminal: Terminal = {
  out: (text) => {
    process.stdout.write(text.endsWith('\n') ? text : `${text}\n`);
  },
  err: process.stderr,
};

/** Printed data, one document. JSON has no infinity: where a number may be one, the command says what stands for it. */
export function printJson({ out }: Terminal, data: unknown): void {
  out(JSON.stringify(data, null, 2));
}
