const NOBODY = 65_534;

/** Runs as a user without rights: permissions do not stop root, and tests often run as root. Restores the user afterwards. */
export async function withoutRights(work: () => Promise<void>): Promise<void> {
  const self = process.geteuid?.();
  if (self !== 0 || process.seteuid === undefined) return work();
  process.seteuid(NOBODY);
  try {
    return await work();
  } finally {
    process.seteuid(0);
  }
}
