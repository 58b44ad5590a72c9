import { lstatSync, mkdirSync, statfsSync, statSync } from 'node:fs';
import { join } from 'node:path';
import type { OpenFailure } from './shapes.ts';

/** The folder that holds the record: what is in it, and whether it is safe to keep a record there. */

export const recordFile = (folder: string): string => join(folder, 'record.db');
export const lockFile = (folder: string): string => join(folder, 'lock.db');

/** Made for the owner alone; null: fit for use. */
export function prepareFolder(folder: string): OpenFailure | null {
  mkdirSync(folder, { recursive: true, mode: 0o700 });
  return folderProblem(folder);
}

export function folderProblem(folder: string): OpenFailure | null {
  const unsafe = (message: string): OpenFailure => ({ kind: 'unsafe folder', message });
  const about = statSync(folder, { throwIfNoEntry: false });
  if (about === undefined) return { kind: 'nothing on record', message: `${folder}: there is no state folder yet.` };
  if (!about.isDirectory()) return unsafe(`${folder}: the state folder is not a folder.`);
  if ((about.mode & 0o002) !== 0) {
    return unsafe(`${folder}: everybody on this machine may write here. Run: chmod 700 ${folder}`);
  }
  const network = networkFileSystem(statfsSync(folder).type);
  if (network !== null) {
    return unsafe(`${folder}: this is a ${network} file system, whose locks cannot be relied on. Use a local disk.`);
  }
  for (const file of [recordFile(folder), lockFile(folder)]) {
    const entry = lstatSync(file, { throwIfNoEntry: false });
    if (entry !== undefined && !entry.isFile()) return unsafe(`${file}: not a plain file. Nothing was touched.`);
  }
  return null;
}

/** Numbers of statfs(2), from linux/magic.h (from memory). */
export function networkFileSystem(type: number): string | null {
  const names: Readonly<Record<number, string>> = {
    26985: 'NFS',
    20859: 'SMB',
    4283649346: 'CIFS',
    4266872130: 'SMB2',
    1397113167: 'AFS',
    12805120: 'Ceph',
  };
  return names[type >>> 0] ?? null;
}

/** Tells whether a file is still the one that it was: `stat` only, the file is never opened. */
export function placeOf(file: string): () => boolean {
  const then = statSync(file);
  return () => {
    const now = statSync(file, { throwIfNoEntry: false });
    return now !== undefined && now.ino === then.ino && now.dev === then.dev;
  };
}
