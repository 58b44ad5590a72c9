// Holds a state folder until it is killed; run by openStore.test.ts.
import { openStore } from '../../../daemon/store/index.ts';

const opened = openStore(process.argv[2]!, { mode: 'daemon' });
process.stdout.write(opened.ok ? 'held\n' : `${opened.failure.kind}\n`);
if (opened.ok) setInterval(() => opened.store.meta('alive'), 1000);
