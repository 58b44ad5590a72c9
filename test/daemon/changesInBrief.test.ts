import { describe, expect, it } from 'vitest';
import { changesInBrief } from '../../daemon/changesInBrief.ts';
import { sampleEvent } from './store/sample.ts';

const line = (id: string, at: string, what: string) => ({ event: sampleEvent({ id }), at, what });

describe('what changed, in brief', () => {
  it('says one thing an event: its states in order, then how often it was refined', () => {
    const brief = changesInBrief([
      line('b', '2026-03-02T04:00:00Z', 'Δν/ν interval narrowed by 20 %'),
      line('a', '2026-03-02T03:00:00Z', 'Δν̇ interval narrowed by 12 %'),
      line('a', '2026-03-02T02:00:00Z', 'suspected → confirmed'),
      line('a', '2026-03-02T01:00:00Z', 'Δν/ν 2.3e-9 → 2.6e-9'),
    ]);
    expect(brief.map(({ event, at, what }) => [event.id, at, what])).toEqual([
      ['b', '2026-03-02T04:00:00Z', 'Δν/ν interval narrowed by 20 %'],
      ['a', '2026-03-02T03:00:00Z', 'suspected → confirmed; refined 2 times, last: Δν̇ interval narrowed by 12 %'],
    ]);
  });

  it('has nothing to say of a quiet night', () => {
    expect(changesInBrief([])).toEqual([]);
  });
});
