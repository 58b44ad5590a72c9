import { join } from 'node:path';
import { fileBatch, LATER, NEXT_DAY, notice, open, sampleMessage, upsert } from './sample.ts';

/**
 * The work of one night. What is acknowledged must be on record whatever happens next. Run again on the same folder, it goes on
 * where the record stands.
 */
export async function oneNight(folder: string, acknowledge: (what: string) => void): Promise<void> {
  const store = open(folder);
  acknowledge('opened');
  if (store.knownFile('nightly', 'night-1.csv') === null) {
    store.commitIntake(fileBatch(0, 3));
  }
  acknowledge('first file');
  if (store.knownFile('nightly', 'night-2.csv') === null) {
    const batch = fileBatch(3, 2, { path: 'night-2.csv', rows: 4 });
    store.commitIntake({
      ...batch,
      sightings: [{ key: 'key-000002', line: 2 }],
      quarantined: [{ line: 9, reason: 'uncertainty_us: "x" is not a number' }],
      statusChanges: [{ key: 'key-000000', status: 'withdrawn', reason: 'gone from the file' }],
      retimed: [{ key: 'key-000001', barycentred: null, quality: 'unusable', qualityReasons: ['no table'] }],
      reports: [
        {
          pulsar: 'KR 0417+31',
          basis: 'model 1',
          events: [],
          locked: true,
          noise: { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 0 },
          lastArrivalMjd: 60_004.1,
        },
      ],
      events: [upsert()],
      messages: [sampleMessage()],
    });
  }
  acknowledge('second file');
  for (;;) {
    const mail = store.claimDue(LATER);
    if (mail === null) break;
    // What a mail server would say between claim and settlement.
    acknowledge(`accepted ${mail.messageId} ${mail.recipient}`);
    store.settle(mail.id, { kind: 'delivered', at: LATER });
    acknowledge(`settled ${mail.messageId} ${mail.recipient}`);
  }
  const judged = store.recordVerdict('KR0417-60003', { verdict: 'accept', by: 'duty', note: 'clear', at: LATER });
  if (judged.kind !== 'recorded' && judged.kind !== 'repeated') throw new Error(judged.kind);
  acknowledge('verdict');
  store.commitDigest('2026-03-02', notice(1, { kind: 'digest', dueAt: NEXT_DAY }), NEXT_DAY);
  acknowledge('digest');
  await store.backup(join(folder, 'copy.db'));
  acknowledge('backup');
  store.close();
  acknowledge('done');
}
