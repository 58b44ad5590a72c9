// Run by crash.test.ts in a process of its own, which is killed at some step of a restore.
import { restore } from '../../../daemon/store/index.ts';
import { NEXT_DAY } from './sample.ts';

const outcome = await restore(process.argv[2]!, process.argv[3]!, NEXT_DAY);
process.stdout.write(outcome.ok ? 'restored\n' : `${outcome.failure.message}\n`);
