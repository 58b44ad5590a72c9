import assert from 'node:assert/strict';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { arrivalKey, isSameTime, measurementOf } from '../../../daemon/intake/key.ts';
import type { ReceivedRow } from '../../../daemon/intake/rows.ts';
import { createArrivalLog, rowAt } from '../../support/arrivalLog.ts';

const DAY_US = 86_400e6;

describe('the identity of an arrival', () => {
  it('is its content, whatever the line and the writing of the digits', () => {
    expect(arrivalKey(rowAt(5, { line: 9, timeText: '60000.0' }))).toBe(arrivalKey(rowAt(5)));
    const others: Partial<ReceivedRow>[] = [
      { pulsar: 'x' },
      { uncertaintyUs: 11 },
      { frequencyMhz: Number.POSITIVE_INFINITY },
      { site: 'x' },
      { receiver: '' },
      { pulseNumber: 1 },
      { signalToNoise: 1 },
      { note: 'x' },
      { timeScale: 'TDB' },
    ];
    const keys = [rowAt(5), rowAt(5.1), ...others.map((change) => rowAt(5, change))].map(arrivalKey);
    expect(new Set(keys).size).toBe(keys.length);
  });

  it('as a measurement reaches 1 µs, over midnight too', () => {
    expect(isSameTime(rowAt(DAY_US - 0.5), rowAt(DAY_US + 0.5))).toBe(true);
    expect(isSameTime(rowAt(0), rowAt(1))).toBe(true);
    expect(isSameTime(rowAt(0), rowAt(1.01))).toBe(false);
    expect(measurementOf(rowAt(0, { frequencyMhz: Number.POSITIVE_INFINITY }))).not.toBe(measurementOf(rowAt(0)));
  });
});

describe('a delivery', () => {
  it('A18 counts a row once, however often and in however many files it stands', () => {
    const log = createArrivalLog();
    const [first, again] = [rowAt(0), rowAt(0, { line: 3 })];
    const result = log.deliver('a.csv', [first, again]);
    expect(result).toMatchObject({ added: [{ row: first, revises: null }], same: [{ line: 3 }], statusChanges: [] });
    const copy = log.deliver('b.csv', [first, again]);
    expect(copy).toMatchObject({ added: [], same: [{ line: 2 }, { line: 3 }], statusChanges: [], pulsarsToDecide: [] });
    expect(log.live()).toHaveLength(1);
  });

  it('A18 keeps a row that one of its two files drops', () => {
    const log = createArrivalLog();
    log.deliver('a.csv', [rowAt(0)]);
    log.deliver('b.csv', [rowAt(0)]);
    expect(log.deliver('a.csv', [])).toMatchObject({ statusChanges: [], pulsarsToDecide: [] });
    expect(log.deliver('b.csv', [])).toMatchObject({
      statusChanges: [{ status: 'withdrawn', reason: 'no longer in b.csv' }],
    });
  });

  it('A5 revises: the new value is live, the old one stays on record', () => {
    const log = createArrivalLog();
    const [old, fresh, other] = [rowAt(0), rowAt(0.4, { uncertaintyUs: 3 }), rowAt(50)];
    log.deliver('a.csv', [old, other]);
    const result = log.deliver('a.csv', [fresh, other]);
    expect(result).toMatchObject({
      added: [{ row: fresh, revises: arrivalKey(old) }],
      same: [{ key: arrivalKey(other) }],
      statusChanges: [{ key: arrivalKey(old), status: 'revised', reason: 'revised by a.csv, line 2' }],
      pulsarsToDecide: ['KR 0417+31'],
    });
    expect(
      log
        .live()
        .map(({ key }) => key)
        .sort(),
    ).toEqual([arrivalKey(fresh), arrivalKey(other)].sort());
  });

  it('A5 takes a change beyond 1 µs for another arrival', () => {
    const log = createArrivalLog();
    log.deliver('a.csv', [rowAt(0)]);
    const result = log.deliver('a.csv', [rowAt(20)]);
    expect(result).toMatchObject({ added: [{ revises: null }], statusChanges: [{ status: 'withdrawn' }] });
  });

  it('A6 withdraws rows that are gone, and takes them back when they return', () => {
    const log = createArrivalLog();
    log.deliver('a.csv', [rowAt(0), rowAt(50)]);
    log.deliver('a.csv', [rowAt(0)]);
    expect(log.status(rowAt(50))).toBe('withdrawn');
    const back = log.deliver('a.csv', [rowAt(0), rowAt(50, { line: 3 })]);
    expect(back).toMatchObject({
      added: [],
      statusChanges: [{ status: 'live', reason: 'stated again by a.csv, line 3' }],
    });
  });

  it('A19 believes the file delivered last, keeps both values, and falls back when it goes', () => {
    const log = createArrivalLog();
    const [first, second] = [rowAt(0), rowAt(0, { uncertaintyUs: 99 })];
    log.deliver('a.csv', [first]);
    log.deliver('b.csv', [second]);
    expect([log.status(first), log.status(second)]).toEqual(['revised', 'live']);
    log.deliver('b.csv', []);
    expect([log.status(first), log.status(second)]).toEqual(['live', 'withdrawn']);
  });

  it('A19 does not let a growing file that repeats the old value undo a correction', () => {
    const log = createArrivalLog();
    const [old, corrected] = [rowAt(0), rowAt(0, { uncertaintyUs: 99 })];
    log.deliver('all.csv', [old]);
    log.deliver('correction.csv', [corrected]);
    log.deliver('all.csv', [old, rowAt(50, { line: 3 })]);
    expect([log.status(old), log.status(corrected)]).toEqual(['revised', 'live']);
  });

  it('A19 believes the later line within a file', () => {
    const log = createArrivalLog();
    const [earlier, later] = [rowAt(0, { line: 9, note: 'later' }), rowAt(0, { note: 'earlier' })];
    log.deliver('a.csv', [later, earlier]);
    expect([log.status(earlier), log.status(later)]).toEqual(['live', 'revised']);
  });
});

describe('any deliveries', () => {
  const row = fc
    .record({
      slot: fc.nat(5),
      shift: fc.constantFrom(0, 0.6, 1.2),
      uncertaintyUs: fc.constantFrom(1, 2),
      pulsar: fc.constantFrom('A', 'B'),
    })
    .map(({ slot, shift, ...rest }) => rowAt(slot * 100 + shift, rest));
  const file = fc.array(row, { maxLength: 8 }).map((rows) => rows.map((each, index) => ({ ...each, line: index + 2 })));
  const deliveries = fc.array(fc.tuple(fc.constantFrom('a', 'b', 'c'), file), { maxLength: 8 });

  it('leave one live value for each arrival that some file states, and none for others', () => {
    fc.assert(
      fc.property(deliveries, (sequence) => {
        const log = createArrivalLog();
        for (const [path, rows] of sequence) {
          const { added, same } = log.deliver(path, rows);
          assert.equal(added.length + same.length, rows.length);
        }
        const stated = [...new Map(sequence).values()].flat();
        for (const [, rows] of sequence) for (const each of rows) assert.notEqual(log.status(each), undefined);
        const live = log.live();
        const liveKeys = new Set(live.map(({ key }) => key));
        const statedKeys = new Set(stated.map(arrivalKey));
        for (const key of liveKeys) assert.ok(statedKeys.has(key));
        // A slow twin: chains of stated rows by hand; each must hold exactly one live value.
        for (const chain of chainsOf(stated)) {
          assert.equal(new Set(chain.map(arrivalKey).filter((key) => liveKeys.has(key))).size, 1);
        }
      }),
      { numRuns: 200 },
    );
  });

  it('A20 give the same live set in any order, as long as files do not contradict each other', () => {
    const content = fc.uniqueArray(row, {
      selector: ({ pulsar, time }) => `${pulsar} ${Math.floor(time.fraction * 864e6)}`,
      maxLength: 8,
    });
    const files = content.chain((rows) =>
      fc.array(fc.subarray(rows), { minLength: 1, maxLength: 4 }).chain((parts) =>
        fc.tuple(
          fc.constant(parts),
          fc.shuffledSubarray(
            parts.map((_, index) => index),
            { minLength: parts.length },
          ),
        ),
      ),
    );
    fc.assert(
      fc.property(files, ([parts, order]) => {
        const [sorted, shuffled] = [createArrivalLog(), createArrivalLog()];
        for (const [index, rows] of parts.entries()) sorted.deliver(`file ${index}`, rows);
        for (const index of order) shuffled.deliver(`file ${index}`, parts[index]!);
        expect(shuffled.live().map(({ key }) => key)).toEqual(sorted.live().map(({ key }) => key));
      }),
      { numRuns: 100 },
    );
  });

  it('A20 put the same values on record in any order, even where files contradict each other', () => {
    fc.assert(
      fc.property(fc.array(file, { maxLength: 5 }), fc.nat(), (parts, turn) => {
        const [one, two] = [createArrivalLog(), createArrivalLog()];
        const order = parts.map((_, index) => (index + turn) % parts.length).reverse();
        for (const [index, rows] of parts.entries()) one.deliver(`file ${index}`, rows);
        for (const index of order) two.deliver(`file ${index}`, parts[index]!);
        expect([...two.records.keys()].sort()).toEqual([...one.records.keys()].sort());
        expect(two.live().length).toBe(one.live().length);
      }),
      { numRuns: 100 },
    );
  });
});

/** Rows of one pulsar whose times, one after the other, are within 1 µs: by comparing all pairs until nothing joins any more. */
function chainsOf(rows: readonly ReceivedRow[]): ReceivedRow[][] {
  let chains = rows.map((row) => [row]);
  for (let joined = true; joined; ) {
    joined = false;
    for (const chain of chains) {
      const near = chains.find(
        (other) => other !== chain && other.some((a) => chain.some((b) => a.pulsar === b.pulsar && isSameTime(a, b))),
      );
      if (near === undefined) continue;
      chain.push(...near);
      chains = chains.filter((other) => other !== near);
      joined = true;
      break;
    }
  }
  return chains;
}
