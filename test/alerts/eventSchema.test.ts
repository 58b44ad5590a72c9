import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { eventJson } from '../../alerts/index.ts';
import { EXPLANATIONS, type PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { complaints, type Schema } from '../support/jsonSchema.ts';
import { ROOT } from '../support/sourceTree.ts';
import { GLITCH, SITE_STEP } from './samples.ts';

// The published schema (JSON Schema, draft 2020-12) against what is written.

const schema = JSON.parse(readFileSync(join(ROOT, 'alerts/notice/event.schema.json'), 'utf8')) as Schema & {
  readonly properties: Readonly<Record<string, Schema>>;
};
const read = (event: PulsarEvent): unknown => JSON.parse(eventJson(event));

const RECOVERING: PulsarEvent = {
  ...GLITCH,
  recovery: {
    terms: [{ fraction: 0.02, fractionInterval68: [0.01, 0.03], timescaleDays: 18, timescaleDaysInterval68: [12, 25] }],
    q: 0.02,
  },
};

describe('the schema of an event', () => {
  test.each([
    ['a glitch', GLITCH],
    ['one that recovers', RECOVERING],
    ['a step of a site', SITE_STEP],
    ['a suspicion', { ...GLITCH, state: 'suspected', confirmedAtMjd: null } as PulsarEvent],
  ])('takes %s', (_, event) => {
    expect(complaints(read(event), schema)).toEqual([]);
  });

  test('names every field that is written, and every explanation', () => {
    expect(Object.keys(read(GLITCH) as object).filter((name) => !(name in schema.properties))).toEqual([]);
    expect(schema.properties['explanation']!['enum']).toEqual([...EXPLANATIONS]);
  });

  test.each([
    ['a field that is missing', { epochMjd: undefined }, '$ has no epochMjd'],
    ['a number as text', { deltaNuHz: '2e-8' }, '$.deltaNuHz is no number,null'],
    ['an interval with one end', { epochInterval68: [60_123] }, '$.epochInterval68 breaks minItems 2'],
    ['a state that is none', { state: 'candidate' }, '$.state is none of'],
    ['a probability above one', { explanations: { glitch: 1.2 } }, '$.explanations.glitch breaks maximum 1'],
    ['half an arrival', { arrivalsUsed: 1.5 }, '$.arrivalsUsed is no integer'],
    ['no pulsar', { pulsars: [] }, '$.pulsars breaks minItems 1'],
    [
      'a recovery in no time',
      { recovery: { terms: [{ ...RECOVERING.recovery.terms[0], timescaleDays: 0 }], q: 1 } },
      '$.recovery.terms[0].timescaleDays breaks exclusiveMinimum 0',
    ],
  ])('refuses %s', (_, change, complaint) => {
    const damaged = JSON.parse(JSON.stringify({ ...GLITCH, ...change })) as unknown;
    expect(complaints(damaged, schema).join('\n')).toContain(complaint);
  });
});
