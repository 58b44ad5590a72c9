/** What became of the news of an event, as its history keeps it: one of these, then a colon and the reason. */
export const MAILED = 'mailed';
export const NOT_MAILED = 'not mailed';
export const HELD = 'held in the quiet hours';
export const SUMMARY_ONLY = 'in the storm notice only';
export const PAGE_ONLY = 'on the page only, in a storm';

/** The news was worth a mail, and none left at once. */
export function wasHeldBack(alert: string | null): boolean {
  return alert !== null && [HELD, SUMMARY_ONLY, PAGE_ONLY].some((words) => alert.startsWith(words));
}
