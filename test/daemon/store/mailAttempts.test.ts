import { expect, test } from 'vitest';
import type { Store } from '../../../daemon/store/index.ts';
import { AT, LATER, NEXT_DAY, notice } from './sample.ts';
import { useRecord } from './useRecord.ts';

let store: Store;
const record = useRecord((own) => {
  store = own;
});

test('each attempt at a mail is kept, with its beginning and its end', () => {
  store.commitNotice(notice(1), AT);
  const { id } = store.claimDue(AT)!;
  expect(store.mailAttempts([id]).get(id)).toEqual([{ begunAt: AT, outcome: null }]);
  store.settle(id, { kind: 'later', dueAt: LATER, error: '451 greylisted' });
  store.claimDue(LATER);
  store.settle(id, { kind: 'delivered', at: LATER });
  expect(store.mailAttempts([id]).get(id)).toEqual([
    { begunAt: AT, outcome: 'put off: 451 greylisted' },
    { begunAt: LATER, outcome: 'delivered' },
  ]);
  expect(store.mailAttempts([id + 1]).size).toBe(0);
});

test('an attempt that the end of the program cut off says so', () => {
  store.commitNotice(notice(1), AT);
  const { id } = store.claimDue(AT)!;
  record.reopen();
  store.claimDue(NEXT_DAY);
  store.settle(id, { kind: 'refused', error: '550 no such user', at: NEXT_DAY });
  expect(store.mailAttempts([id]).get(id)).toEqual([
    { begunAt: AT, outcome: 'cut off: the program stopped, may have arrived' },
    { begunAt: NEXT_DAY, outcome: 'refused: 550 no such user' },
  ]);
});
