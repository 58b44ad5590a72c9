import Database from 'better-sqlite3';
import { connect } from './connection.ts';
import { verify } from './verify.ts';
import type { Verified } from './verifyBeside.ts';

/** The other side of `verifyBeside`: one look at the record as it stood at one moment, while the daemon goes on writing. */

function verified(file: string): Verified {
  try {
    const db = connect(file, { mustExist: true });
    try {
      return { problems: db.transaction(() => verify(db)).deferred() };
    } finally {
      db.close();
    }
  } catch (error) {
    if (error instanceof Database.SqliteError) return { message: error.message, code: error.code };
    throw error;
  }
}

const answer = verified(process.argv[2]!);
if (process.connected) process.send?.(answer, () => process.disconnect());
