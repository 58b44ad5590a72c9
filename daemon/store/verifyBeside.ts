import Database from 'better-sqlite3';
import { startHelper } from '../helperProcess.ts';

/** What the other process answers: an error of the database loses its kind on the way. */
export type Verified = { readonly problems: string[] } | { readonly message: string; readonly code: string };

/** `verify` in a process of its own: it goes through all of a large record, and page, mail and watchdog must not wait for it. */
export function verifyBeside(file: string): Promise<string[]> {
  return new Promise((resolve, reject) => {
    const helper = startHelper('verifyHelper', import.meta.url, [file]);
    helper.once('error', reject);
    helper.once('exit', () => reject(new Error('the check of the record ended without an answer')));
    helper.once('message', (answer: Verified) => {
      if ('problems' in answer) resolve(answer.problems);
      else reject(new Database.SqliteError(answer.message, answer.code));
    });
  });
}
