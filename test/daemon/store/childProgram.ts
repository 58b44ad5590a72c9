import { type ChildProcess, spawn } from 'node:child_process';
import { createRequire } from 'node:module';
import { basename, join } from 'node:path';
import { pathToFileURL } from 'node:url';
import { build } from 'vite';

/** Bundles a program of this folder into one file, so that a child of Node starts in a fraction of a second. */
export async function bundle(program: string, outDir: string): Promise<string> {
  const library = pathToFileURL(createRequire(import.meta.url).resolve('better-sqlite3')).href;
  await build({
    configFile: false,
    logLevel: 'error',
    build: {
      ssr: join(import.meta.dirname, program),
      outDir,
      emptyOutDir: false,
      target: 'node20',
      rollupOptions: {
        external: ['better-sqlite3'],
        output: { paths: { 'better-sqlite3': library }, entryFileNames: '[name].mjs' },
      },
    },
  });
  return join(outDir, basename(program).replace(/\.ts$/, '.mjs'));
}

export interface Ended {
  readonly code: number | null;
  readonly signal: NodeJS.Signals | null;
  readonly lines: readonly string[];
  readonly errors: string;
}

export interface Child {
  readonly process: ChildProcess;
  readonly ended: Promise<Ended>;
  /** Waits until the child has printed that line. */
  printed(line: string): Promise<void>;
}

export function start(
  program: string,
  args: readonly string[],
  environment: Readonly<Record<string, string>> = {},
): Child {
  const child = spawn(process.execPath, [program, ...args], { env: { ...process.env, ...environment } });
  let output = '';
  let errors = '';
  let look = () => {};
  child.stdout.on('data', (part: Buffer) => {
    output += part;
    look();
  });
  child.stderr.on('data', (part: Buffer) => {
    errors += part;
  });
  const lines = () => output.split('\n').filter((line) => line !== '');
  const ended = new Promise<Ended>((resolve) => {
    child.on('close', (code, signal) => resolve({ code, signal, lines: lines(), errors }));
  });
  return {
    process: child,
    ended,
    printed: (line) =>
      new Promise((resolve, reject) => {
        look = () => {
          if (lines().includes(line)) resolve();
        };
        void ended.then(() => reject(new Error(`the child ended without printing ${line}: ${errors}`)));
        look();
      }),
  };
}
