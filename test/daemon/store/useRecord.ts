import { afterEach, beforeEach, expect } from 'vitest';
import type { Store } from '../../../daemon/store/index.ts';
import { open, temporaryFolder } from './sample.ts';

/** An empty record for each test, in a folder of its own; what the test leaves must be sound. `begin` is told of it whenever it is opened. */
export function useRecord(begin: (store: Store, folder: string) => void): { reopen(): void } {
  let folder: ReturnType<typeof temporaryFolder>;
  let store: Store;
  const start = () => {
    store = open(folder.path);
    begin(store, folder.path);
  };
  beforeEach(() => {
    folder = temporaryFolder();
    start();
  });
  afterEach(() => {
    expect(store.verify()).toEqual([]);
    store.close();
    folder.remove();
  });
  return {
    reopen() {
      store.close();
      start();
    },
  };
}
