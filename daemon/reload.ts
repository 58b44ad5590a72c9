import type { Configuration } from './config/configuration.ts';
import { loadConfiguration } from './config/loadConfiguration.ts';
import { problemLine } from './opening.ts';

export type Reread =
  | { readonly configuration: Configuration; readonly warnings: readonly string[] }
  /** All of them: each keeps the old configuration in force. */
  | { readonly problems: readonly string[] };

/** Reads the operator's files again while the daemon runs. The state folder is the one thing that cannot change under it. */
export function rereadConfiguration({ file, stateFolder }: Configuration): Reread {
  const { configuration, problems } = loadConfiguration(file);
  if (configuration === null) {
    return { problems: problems.filter(({ severity }) => severity === 'error').map(problemLine) };
  }
  if (configuration.stateFolder !== stateFolder) {
    return { problems: [`${file}: [state] folder cannot change while the watch runs; stop it and start it again`] };
  }
  return { configuration, warnings: problems.map(problemLine) };
}
