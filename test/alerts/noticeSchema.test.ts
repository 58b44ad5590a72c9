import { execFileSync, spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { SaxesParser } from 'saxes';
import { afterAll, describe, expect, test } from 'vitest';
import { voevent } from '../../alerts/index.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { ROOT } from '../support/sourceTree.ts';
import { CONTEXT, GLITCH, SITE_STEP } from './samples.ts';

// Notices against readers that are not ours: saxes for well-formedness, libxml2's xmllint with a schema written from the
// Recommendation (VOEvent 2.0, 11 July 2011; from memory), and Python's expat, which must read back the numbers.

const HOSTILE = '<&>"\' ]]> ν̇ \u0000 \ud800';
const NOTICES: readonly (readonly [string, string])[] = [
  ['a first notice', voevent(GLITCH, { ...CONTEXT, revision: 1, cites: null })],
  ['an update', voevent(GLITCH, CONTEXT)],
  ['a withdrawal', voevent({ ...GLITCH, state: 'withdrawn' }, CONTEXT)],
  ['a drill', voevent(GLITCH, { ...CONTEXT, drill: true, cites: null })],
  ['a step of a site', voevent(SITE_STEP, { ...CONTEXT, model: null })],
  ['hostile names', voevent({ ...SITE_STEP, pulsar: HOSTILE, site: HOSTILE, pulsars: [HOSTILE] }, CONTEXT)],
  ['a recovery', voevent(recovering(), CONTEXT)],
];

function recovering(): PulsarEvent {
  const term = {
    fraction: 0.02,
    fractionInterval68: [0.01, 0.03],
    timescaleDays: 18,
    timescaleDaysInterval68: [12, 25],
  };
  return { ...GLITCH, recovery: { terms: [term as unknown as PulsarEvent['recovery']['terms'][number]], q: 0.02 } };
}

const folder = mkdtempSync(join(tmpdir(), 'spinvigil-notice-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));
function fileOf(source: string): string {
  const file = join(folder, 'notice.xml');
  writeFileSync(file, source);
  return file;
}

describe('a notice is well-formed XML with namespaces', () => {
  test.each(NOTICES)('%s', (_, source) => {
    const parser = new SaxesParser({ xmlns: true });
    parser.on('error', (error) => {
      throw error;
    });
    expect(() => parser.write(source).close()).not.toThrow();
  });
});

const SCHEMA = join(ROOT, 'test/data/voevent/voevent-2.0-subset.xsd');
const xmllint = (file: string) => spawnSync('xmllint', ['--nonet', '--noout', '--schema', SCHEMA, file]);
const thereIsXmllint = spawnSync('xmllint', ['--version']).status === 0;
if (!thereIsXmllint) console.warn('SKIPPED: notices against their schema; install the Debian package libxml2-utils');

describe.skipIf(!thereIsXmllint)('a notice fits the schema of VOEvent 2.0, says libxml2', () => {
  test.each(NOTICES)('%s', (_, source) => {
    const { status, stderr } = xmllint(fileOf(source));
    expect(stderr.toString()).toContain('validates');
    expect(status).toBe(0);
  });

  const update = NOTICES[1]![1];
  test.each([
    ['another role', update.replace('role="observation"', 'role="alarm"')],
    ['a citation of no kind', update.replace('cite="supersedes"', 'cite="replaces"')],
    [
      'a position before its time',
      update.replace(/(<Time [\s\S]*<\/Time>)(\s*)(<Position2D[\s\S]*<\/Position2D>)/, '$3$2$1'),
    ],
    ['a probability above one', update.replace(/probability="[^"]*"/, 'probability="1.5"')],
    ['no author', update.replace(/<AuthorIVORN>.*<\/AuthorIVORN>/, '')],
    ['a part that the standard does not have', update.replace('</Who>', '</Who><Where/>')],
  ])('and it refuses %s', (_, source) => {
    expect(source).not.toBe(update);
    expect(xmllint(fileOf(source)).status).not.toBe(0);
  });
});

const PYTHON = '/usr/bin/python3';
const READER = `
import json, sys, xml.etree.ElementTree as tree
root = tree.parse(sys.argv[1]).getroot()
params = {p.get("name"): [p.get("value"), p.get("unit")] for p in root.iter("Param")}
print(json.dumps({"tag": root.tag, "role": root.get("role"), "ivorn": root.get("ivorn"), "params": params,
  "cites": [[c.get("cite"), c.text] for c in root.iter("EventIVORN")],
  "why": [[i.get("probability"), i.findtext("Concept")] for i in root.iter("Inference")]}))
`;
const thereIsPython = spawnSync(PYTHON, ['--version']).status === 0;
if (!thereIsPython) console.warn('SKIPPED: notices read back by another reader; install the Debian package python3');

describe.skipIf(!thereIsPython)('a notice read by expat', () => {
  const readBack = (source: string) =>
    JSON.parse(execFileSync(PYTHON, ['-c', READER, fileOf(source)]).toString()) as {
      readonly tag: string;
      readonly role: string;
      readonly ivorn: string;
      readonly params: Readonly<Record<string, readonly [string, string | null]>>;
      readonly cites: readonly (readonly [string, string])[];
      readonly why: readonly (readonly [string, string])[];
    };

  test('says what the event says, to the last digit', () => {
    const { tag, role, params, cites, why } = readBack(NOTICES[1]![1]);
    expect(tag).toBe('{http://www.ivoa.net/xml/VOEvent/v2.0}VOEvent');
    expect(role).toBe('observation');
    expect(Number(params['delta_nu']![0])).toBe(GLITCH.deltaNuHz);
    expect(Number(params['epoch_low']![0])).toBe(GLITCH.epochInterval68[0]);
    expect(Number(params['epoch']![0])).toBe(GLITCH.epochMjd);
    expect(cites).toEqual([['supersedes', 'ivo://kestrel-ridge.example/spinvigil#KR0417+31-60123-a-r1']]);
    expect(why[0]).toEqual(['0.9982', 'glitch']);
  });

  test('has units as VOUnits 1.0 spells them (from memory): powers with two stars, quotients with a stroke', () => {
    const units = new Set(Object.values(readBack(NOTICES[6]![1]).params).map(([, unit]) => unit));
    expect([...units].filter((unit) => unit !== null).sort()).toEqual(['Hz', 'Hz/s', 'd', 'yr**-1']);
  });

  test('of a drill says that it is a test; a withdrawal retracts', () => {
    expect(readBack(NOTICES[3]![1])).toMatchObject({ role: 'test', cites: [] });
    expect(NOTICES[3]![1]).toContain('<Description>DRILL: ');
    expect(readBack(NOTICES[2]![1]).cites[0]![0]).toBe('retraction');
  });
});
