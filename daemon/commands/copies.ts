import { resolve } from 'node:path';
import { systemClock } from '../clock.ts';
import { EXIT, OperatorError, reasonOf } from '../errors.ts';
import { failed, loadOrders } from '../opening.ts';
import { restore as restoreRecord } from '../store/index.ts';
import { withRecord } from './record.ts';
import type { Terminal } from './terminal.ts';

/** `backup`: a consistent, checked copy of the record, while the daemon runs. */
export async function backup(terminal: Terminal, file: string, options: { readonly config: string }): Promise<void> {
  await withRecord(options.config, async (store) => {
    try {
      await store.backup(resolve(file));
    } catch (error) {
      throw new OperatorError(`no copy was made: ${reasonOf(error)}`, { exitCode: EXIT.workFailed, cause: error });
    }
  });
  terminal.out(`${file}: a complete, checked copy.`);
}

/** `restore`: the record as a copy has it; the daemon must not run. */
export async function restore(terminal: Terminal, file: string, options: { readonly config: string }): Promise<void> {
  const { configuration } = loadOrders(options.config);
  const at = systemClock.now().toISOString();
  const restored = await restoreRecord(resolve(file), configuration.stateFolder, at);
  if (!restored.ok) throw failed(restored.failure);
  const aside = restored.keptAside === null ? '' : ` What was there is kept as ${restored.keptAside}.`;
  terminal.out(`${configuration.stateFolder}: restored from ${file}.${aside}`);
}
