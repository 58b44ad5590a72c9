import { type ChildProcess, fork } from 'node:child_process';
import { createRequire } from 'node:module';
import { fileURLToPath, pathToFileURL } from 'node:url';

/**
 * A module of ours as a process of its own, for work that would hold up the daemon, or may never end: the compiled one, or, where the program
 * runs from its sources, the source with what reads it. It keeps the daemon neither from going on nor from ending, and ends when the daemon is gone.
 * @param name without its ending, beside the module whose `import.meta.url` is `from`
 */
export function startHelper(name: string, from: string, args: readonly string[] = []): ChildProcess {
  const isSource = from.endsWith('.ts');
  const file = fileURLToPath(new URL(`./${name}.${isSource ? 'ts' : 'js'}`, from));
  const reader = isSource ? ['--import', pathToFileURL(createRequire(from).resolve('tsx')).href] : [];
  const helper = fork(file, [...args], {
    execArgv: [...LEAN, ...reader],
    env: { ...process.env, UV_THREADPOOL_SIZE: '1' },
    serialization: 'advanced',
    stdio: ['ignore', 'ignore', 'inherit', 'ipc'],
  });
  helper.unref();
  helper.channel?.unref();
  return helper;
}

/** As few threads as will do: the service may have only so many. */
const LEAN = ['--v8-pool-size=1'];
