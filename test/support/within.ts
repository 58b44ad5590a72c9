import { setTimeout as pause } from 'node:timers/promises';

/** Looks until `what` holds or the time is over; answers whether it came to hold. */
export async function within(seconds: number, what: () => boolean | Promise<boolean>): Promise<boolean> {
  const until = Date.now() + seconds * 1000;
  while (Date.now() < until) {
    if (await what()) return true;
    await pause(50);
  }
  return false;
}
