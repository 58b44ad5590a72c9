import type { MorningReview } from '../alerts/index.ts';

type Change = MorningReview['changed'][number];

/** A change of state, as the pipeline words it, is news; a size that sharpened is not, one line each. */
const STATE = /\b(suspected|confirmed|withdrawn|accepted|rejected)\b/;
/** Nobody reads more of one event in the morning; all of it stands on its page. */
const MOST_STATES = 3;

/** One line an event, newest event first: its changes of state in the order they came, then how often it was refined. */
export function changesInBrief(newestFirst: readonly Change[]): Change[] {
  const byEvent = new Map<string, Change[]>();
  for (const change of newestFirst) byEvent.set(change.event.id, [...(byEvent.get(change.event.id) ?? []), change]);
  return [...byEvent.values()].map((changes) => {
    const states = changes.filter(({ what }) => STATE.test(what)).slice(0, MOST_STATES);
    const refined = changes.length - states.length;
    const times = refined === 1 ? 'refined once' : `refined ${refined} times, last: ${changes[0]!.what}`;
    const parts = states.map(({ what }) => what).reverse();
    if (states.length === 0 && refined === 1) parts.push(changes[0]!.what);
    else if (refined > 0) parts.push(times);
    return { event: changes[0]!.event, at: changes[0]!.at, what: parts.join('; ') };
  });
}
