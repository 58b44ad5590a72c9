import assert from 'node:assert/strict';
import { isUtf8 } from 'node:buffer';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { readCsv } from '../../../../daemon/intake/layouts/csv.ts';
import type { ArrivalFile, ReceivedRow } from '../../../../daemon/intake/rows.ts';
import { slowDecimal, slowRecordAt } from '../../../support/slowCsv.ts';

const HEADER = 'pulsar,mjd_utc,uncertainty_us,frequency_mhz,site,receiver,pulse_number,note';
const COLUMNS = HEADER.split(',');

const decimal = (low: number, high: number) => fc.double({ min: low, max: high, noNaN: true }).map(String);
const goodRow = fc
  .tuple(
    fc.constantFrom('KR 0417+31', 'KR 0009-1', '"KR, 1"'),
    fc
      .tuple(fc.integer({ min: 50_000, max: 65_000 }), fc.stringMatching(/^[0-9]{1,22}$/))
      .map(([day, digits]) => `${day}.${digits}`),
    decimal(0.001, 1e5),
    fc.oneof(decimal(50, 20_000), fc.constant('inf')),
    fc.constantFrom('ridge', 'coast'),
    fc.constantFrom('', 'L', '"S ""new"""'),
    fc.oneof(fc.constant(''), fc.integer().map(String)),
    fc.constantFrom('', 'fine', '"two\nlines"', '"a, b"', 'é±μ'),
  )
  .map((fields) => fields.join(','));

const mutation = fc.oneof(
  fc.record({ kind: fc.constant('replace' as const), at: fc.nat(5000), byte: fc.integer({ min: 0, max: 255 }) }),
  fc.record({
    kind: fc.constant('insert' as const),
    at: fc.nat(5000),
    byte: fc.constantFrom(...Buffer.from('",\n\r0.9e-+x \0')),
  }),
  fc.record({ kind: fc.constant('remove' as const), at: fc.nat(5000), byte: fc.constant(0) }),
  fc.record({ kind: fc.constant('cut' as const), at: fc.nat(5000), byte: fc.constant(0) }),
);

/** Changes behind the header, so that there is something to read. */
function mutate(text: string, mutations: readonly { kind: string; at: number; byte: number }[]): Buffer {
  let bytes = Buffer.from(text);
  for (const { kind, at, byte } of mutations) {
    const place = HEADER.length + 1 + (at % Math.max(1, bytes.length - HEADER.length - 1));
    const [front, back] = [bytes.subarray(0, place), bytes.subarray(place)];
    if (kind === 'cut') bytes = Buffer.from(front);
    else if (kind === 'remove') bytes = Buffer.concat([front, back.subarray(1)]);
    else bytes = Buffer.concat([front, Buffer.from([byte]), kind === 'insert' ? back : back.subarray(1)]);
  }
  return bytes;
}

describe('files damaged at random', () => {
  it('never crash the reader, whatever the bytes', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 2000 }), fc.boolean(), (junk, withHeader) => {
        const file = readCsv(Buffer.concat([Buffer.from(withHeader ? `${HEADER}\n` : ''), junk]));
        for (const row of file.rows) expectSane(row);
      }),
      { numRuns: 1000 },
    );
  });

  it('give no row that a slow reader of our own does not read the same, and lose none without a word', () => {
    let accepted = 0;
    let rejected = 0;
    fc.assert(
      fc.property(
        fc.array(goodRow, { minLength: 1, maxLength: 8 }),
        fc.array(mutation, { maxLength: 4 }),
        (rows, mutations) => {
          const bytes = mutate(`${[HEADER, ...rows].join('\n')}\n`, mutations);
          const file = readCsv(bytes);
          expect(file.fault).toBeNull();
          const covered = checkAgainstSlowReader(file, bytes);
          checkNothingIsLost(file, bytes, covered);
          accepted += file.rows.length;
          rejected += file.rejects.length;
        },
      ),
      { numRuns: 600, seed: 4711 },
    );
    // The test is worth something only while both kinds come up often.
    expect(accepted).toBeGreaterThan(600);
    expect(rejected).toBeGreaterThan(150);
  });
});

function expectSane(row: ReceivedRow): void {
  assert.ok(row.uncertaintyUs > 0);
  assert.ok(row.frequencyMhz > 0);
  assert.ok(row.time.day >= 40_000);
  assert.ok(row.time.day <= 80_000);
}

/** Returns the physical lines that the accepted rows take. */
function checkAgainstSlowReader(file: ArrivalFile, bytes: Buffer): Set<number> {
  const text = bytes.toString('latin1');
  const offsets = lineOffsets(text);
  const covered = new Set<number>();
  for (const row of file.rows) {
    expectSane(row);
    const record = slowRecordAt(text, offsets[row.line - 1]!);
    assert.notEqual(record, null);
    const fields = record!.fields.map((field) => Buffer.from(field, 'latin1').toString('utf8'));
    assert.equal(fields.length, COLUMNS.length);
    const field = (column: string) => fields[COLUMNS.indexOf(column)]!;
    assert.deepEqual(
      [row.pulsar, row.site, row.receiver, row.note ?? ''],
      ['pulsar', 'site', 'receiver', 'note'].map(field),
    );
    assert.equal(row.timeText, field('mjd_utc'));
    expectNear(
      BigInt(row.time.day) * 10n ** 30n + slowDecimal(row.time.fraction.toFixed(25))!,
      field('mjd_utc'),
      10n ** 15n,
    );
    assert.equal(row.uncertaintyUs, Number(field('uncertainty_us')));
    assert.notEqual(slowDecimal(field('uncertainty_us')), null);
    if (field('frequency_mhz') === 'inf') assert.equal(row.frequencyMhz, Number.POSITIVE_INFINITY);
    else assert.equal(row.frequencyMhz, Number(field('frequency_mhz')));
    assert.equal(
      row.pulseNumber === null ? '' : BigInt(row.pulseNumber),
      field('pulse_number') === '' ? '' : BigInt(field('pulse_number')),
    );
    const lines = text.slice(offsets[row.line - 1]!, record!.end).split('\n').length;
    for (let line = row.line; line < row.line + lines; line += 1) covered.add(line);
  }
  return covered;
}

/** Within `tolerance` units of 10⁻³⁰ d. */
function expectNear(value: bigint, text: string, tolerance: bigint): void {
  const exact = slowDecimal(text);
  assert.notEqual(exact, null);
  const error = value > exact! ? value - exact! : exact! - value;
  assert.ok(error <= tolerance);
}

function checkNothingIsLost(file: ArrivalFile, bytes: Buffer, covered: ReadonlySet<number>): void {
  const rejected = new Set(file.rejects.map(({ line }) => line));
  const offsets = lineOffsets(bytes.toString('latin1'));
  for (const [index, offset] of offsets.entries()) {
    const content = bytes.subarray(offset, (offsets[index + 1] ?? bytes.length + 1) - 1);
    const blank = isUtf8(content) && /^[ \t]*\r?$/.test(content.toString('utf8'));
    if (index === 0 || blank || rejected.has(index + 1) || covered.has(index + 1)) continue;
    // Left over: the inner lines of a rejected row whose quoted note runs over lines.
    const above = Math.max(...[...rejected].filter((line) => line < index + 1));
    assert.ok(
      bytes
        .toString('latin1')
        .slice(offsets[above - 1]!, offset)
        .includes('"'),
    );
  }
}

function lineOffsets(text: string): number[] {
  const offsets = [0];
  for (let at = text.indexOf('\n'); at >= 0; at = text.indexOf('\n', at + 1)) offsets.push(at + 1);
  return offsets;
}
