import type { ConfigProblem, Configuration } from './config/configuration.ts';
import { loadConfiguration } from './config/loadConfiguration.ts';
import { EXIT, type ExitCode, OperatorError } from './errors.ts';
import { type OpenFailureKind, openStore, type Store } from './store/index.ts';

/** Opens what every command needs, and turns what can go wrong into words and exit codes. */

export interface LoadedOrders {
  readonly configuration: Configuration;
  /** Complaints that do not keep the program from running. */
  readonly warnings: readonly ConfigProblem[];
}

/** Throws an `OperatorError` that names every error in the configuration, one a line. */
export function loadOrders(file: string): LoadedOrders {
  const { configuration, problems } = loadConfiguration(file);
  if (configuration !== null) return { configuration, warnings: problems };
  const errors = problems.filter(({ severity }) => severity === 'error');
  throw new OperatorError(errors.map(problemLine).join('\n'), { exitCode: EXIT.wrongUsage });
}

/** `spinvigil.toml:12:3: …` */
export function problemLine({ file, line, column, message }: ConfigProblem): string {
  const place = [file, line, column].filter((part) => part !== null).join(':');
  return `${place}: ${message}`;
}

const EXIT_OF: Readonly<Record<OpenFailureKind, ExitCode>> = {
  'held by another instance': EXIT.anotherInstance,
  'newer schema': EXIT.wrongUsage,
  'older schema': EXIT.wrongUsage,
  damaged: EXIT.workFailed,
  'nothing on record': EXIT.workFailed,
  'unsafe folder': EXIT.wrongUsage,
  'unsuitable library': EXIT.workFailed,
  'storage fault': EXIT.workFailed,
};

/** `daemon`: the one writer of the state folder. `reader`: beside it. */
export function openRecord(configuration: Configuration, mode: 'daemon' | 'reader'): Store {
  const opened = openStore(configuration.stateFolder, { mode });
  if (opened.ok) return opened.store;
  throw failed(opened.failure);
}

export function failed(failure: { readonly kind: OpenFailureKind; readonly message: string }): OperatorError {
  return new OperatorError(failure.message, { exitCode: EXIT_OF[failure.kind] });
}
