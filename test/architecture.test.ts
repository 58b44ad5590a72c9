import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { parseSource, ROOT, readSources, type SourceFile } from './support/sourceTree.ts';

// The shape of the house, held by rules over the parsed sources. Each rule lists its violations; "the rules can fail"
// plants one of each.

const KILOBYTE = 1024;
const LARGEST_FILE = 16 * KILOBYTE;
const LONGEST_FUNCTION = 70;

/** Who may import whom: the generator of the sample feeds reads the same sky tables as the daemon, and no more of it. */
const MAY_IMPORT: Readonly<Record<string, readonly string[]>> = {
  detectors: ['detectors/'],
  alerts: ['alerts/', 'detectors/'],
  daemon: ['daemon/', 'alerts/', 'detectors/'],
  'sample-feeds': ['sample-feeds/', 'detectors/', 'daemon/tables/'],
  test: ['test/', 'daemon/', 'alerts/', 'detectors/', 'sample-feeds/'],
};

/** One thing, one room. Tests may touch anything. */
const ONLY_IN: readonly { readonly modules: RegExp; readonly room: RegExp }[] = [
  { modules: /^(better-sqlite3|node:sqlite)$/, room: /^daemon\/store\// },
  { modules: /^chokidar$/, room: /^daemon\/watch\// },
  { modules: /^node-cron$/, room: /^daemon\/schedule\// },
  { modules: /^nodemailer(\/|$)/, room: /^alerts\/mailer(\/|\.ts$)/ },
  { modules: /^(node:)?(net|tls|dgram|dns)(\/|$)/, room: /^(alerts\/mailer(\/|\.ts$)|daemon\/)/ },
  { modules: /^(node:)?https?2?$/, room: /^daemon\// },
  { modules: /^(hono|@hono\/.*)$/, room: /^daemon\/review\// },
];

/** Names that reach outside a pure function. */
const IMPURE =
  /^(Date|performance|process|console|fetch|globalThis|navigator|crypto|setTimeout|setInterval|setImmediate|queueMicrotask|require|Buffer|Math\.random)(\.|$)/;

const SQL =
  /^\s*(SELECT\s.+\sFROM|INSERT\s+(OR\s+\w+\s+)?INTO|UPDATE\s+\w+\s+SET|DELETE\s+FROM|CREATE\s+(TABLE|INDEX|UNIQUE|TRIGGER)|DROP\s+TABLE|PRAGMA\s|BEGIN\s+(IMMEDIATE|EXCLUSIVE)|WITH\s+\w+\s+AS)/s;

const folderOf = (path: string): string => path.split('/')[0] ?? '';
const isTest = (file: SourceFile): boolean => folderOf(file.path) === 'test';

/** detectors ← alerts ← daemon; the detectors use no package at all. */
function wrongWayImports(files: readonly SourceFile[]): string[] {
  return files.flatMap((file) => {
    const allowed = MAY_IMPORT[folderOf(file.path)] ?? [];
    return file.imports
      .filter(({ specifier, target }) =>
        target === null
          ? folderOf(file.path) === 'detectors'
          : !specifier.endsWith('.ts') || !allowed.some((room) => target.startsWith(room)),
      )
      .map(({ line, specifier }) => `${file.path}:${line} imports ${specifier}`);
  });
}

/** Each import cycle once, from its first file in alphabetical order; types that know of each other make none. */
function importCycles(files: readonly SourceFile[]): string[] {
  const targets = new Map(
    files.map(({ path, imports }) => [
      path,
      imports.flatMap(({ target, typeOnly }) => (typeOnly ? [] : (target ?? []))),
    ]),
  );
  const done = new Set<string>();
  const cycles = new Set<string>();
  const visit = (path: string, trail: readonly string[]): void => {
    const at = trail.indexOf(path);
    if (at >= 0) {
      const loop = trail.slice(at);
      const first = loop.indexOf([...loop].sort()[0]!);
      cycles.add([...loop.slice(first), ...loop.slice(0, first)].join(' → '));
    }
    if (at >= 0 || done.has(path)) return;
    for (const next of targets.get(path) ?? []) visit(next, [...trail, path]);
    done.add(path);
  };
  for (const path of targets.keys()) visit(path, []);
  return [...cycles];
}

/** The detectors run in a browser as they are: no clock, no chance, no console, no state between calls. */
function impurities(files: readonly SourceFile[]): string[] {
  return files
    .filter(({ path }) => path.startsWith('detectors/'))
    .flatMap(({ path, uses, topLevelMutables }) => [
      ...uses.filter(({ text }) => IMPURE.test(text)).map(({ line, text }) => `${path}:${line} uses ${text}`),
      ...topLevelMutables.map(({ line, text }) => `${path}:${line} keeps state: ${text}`),
    ]);
}

function outOfRoom(files: readonly SourceFile[]): string[] {
  return files
    .filter((file) => !isTest(file))
    .flatMap(({ path, imports }) =>
      imports
        .filter(({ specifier }) => ONLY_IN.some(({ modules, room }) => modules.test(specifier) && !room.test(path)))
        .map(({ line, specifier }) => `${path}:${line} imports ${specifier}`),
    );
}

function sqlOutsideTheStore(files: readonly SourceFile[]): string[] {
  return files
    .filter((file) => !isTest(file) && !file.path.startsWith('daemon/store/'))
    .flatMap(({ path, strings }) =>
      strings
        .filter(({ text }) => SQL.test(text))
        .map(({ line, text }) => `${path}:${line} holds SQL: ${text.slice(0, 40)}`),
    );
}

/** Log lines carry their own stamp; all else asks the clock that tests can set. */
const CLOCK_READERS = ['daemon/clock.ts', 'daemon/log.ts'];

function clockReaders(files: readonly SourceFile[]): string[] {
  return files
    .filter(({ path }) => /^(alerts|daemon)\//.test(path) && !CLOCK_READERS.includes(path))
    .flatMap(({ path, uses }) =>
      uses
        .filter(({ text, withoutArguments }) => text === 'Date.now' || (text === 'Date' && withoutArguments))
        .map(({ line, text }) => `${path}:${line} reads the clock (${text})`),
    );
}

function tooLarge(files: readonly SourceFile[]): string[] {
  return files.filter(({ bytes }) => bytes > LARGEST_FILE).map(({ path, bytes }) => `${path} has ${bytes} bytes`);
}

function tooLong(files: readonly SourceFile[]): string[] {
  return files
    .filter((file) => !isTest(file))
    .flatMap(({ path, functions }) =>
      functions
        .filter(({ lines }) => lines > LONGEST_FUNCTION)
        .map(({ line, lines }) => `${path}:${line} is ${lines} lines long`),
    );
}

const files = readSources(Object.keys(MAY_IMPORT));

describe('the sources', () => {
  test('are all here', () => {
    for (const folder of Object.keys(MAY_IMPORT)) expect(files.map(({ path }) => folderOf(path))).toContain(folder);
    const known = new Set(files.map(({ path }) => path));
    const dangling = files.flatMap(({ path, imports }) =>
      imports.flatMap(({ target, line }) =>
        target !== null && !known.has(target) ? `${path}:${line} imports ${target}` : [],
      ),
    );
    expect(dangling).toEqual([]);
  });

  test('import one way', () => expect(wrongWayImports(files)).toEqual([]));
  test('import in no circle', () => expect(importCycles(files)).toEqual([]));
  test('keep the detectors pure', () => expect(impurities(files)).toEqual([]));
  test('keep each outside thing in one room', () => expect(outOfRoom(files)).toEqual([]));
  test('keep SQL in the store', () => expect(sqlOutsideTheStore(files)).toEqual([]));
  test('read the wall clock through daemon/clock.ts', () => expect(clockReaders(files)).toEqual([]));

  test('are small files', () => {
    const largest = [...files].sort((a, b) => b.bytes - a.bytes).slice(0, 5);
    console.info(
      `largest files: ${largest.map(({ path, bytes }) => `${path} ${(bytes / KILOBYTE).toFixed(1)} KB`).join(', ')}`,
    );
    expect(tooLarge(files)).toEqual([]);
  });

  test('are short functions', () => {
    const longest = files
      .filter((file) => !isTest(file))
      .flatMap(({ path, functions }) => functions.map(({ line, lines }) => ({ at: `${path}:${line}`, lines })))
      .sort((a, b) => b.lines - a.lines)
      .slice(0, 5);
    console.info(`longest functions: ${longest.map(({ at, lines }) => `${at} ${lines} lines`).join(', ')}`);
    expect(tooLong(files)).toEqual([]);
  });
});

describe('the top level', () => {
  /** The design card's rooms, and what tools demand at the root. */
  const ALLOWED = [
    [
      'README.md',
      'DEVELOPERS.md',
      'package.json',
      'tsconfig.json',
      'detectors',
      'alerts',
      'daemon',
      'test',
      'sample-feeds',
    ],
    ['package-lock.json', 'LICENSE', 'biome.json', 'vitest.config.ts'],
  ].flat();

  const strangers = (names: readonly string[]): string[] => {
    const ignored = readFileSync(join(ROOT, '.gitignore'), 'utf8')
      .split('\n')
      .map((line) => line.replace(/\/$/, ''));
    return names.filter((name) => !name.startsWith('.') && !ignored.includes(name) && !ALLOWED.includes(name));
  };

  test('holds nothing but the design card', () => expect(strangers(readdirSync(ROOT))).toEqual([]));
  test('would not take a stranger', () => expect(strangers(['daemon', 'scripts', 'dist'])).toEqual(['scripts']));
});

describe('the rules can fail', () => {
  const planted = (path: string, text: string): SourceFile[] => [parseSource(path, text)];

  test.each([
    ['detectors/a.ts', "import { sendMail } from '../alerts/index.ts';"],
    ['detectors/a.ts', "import type { Stats } from 'node:fs';"],
    ['detectors/a.ts', "import { mean } from 'simple-statistics';"],
    ['alerts/a.ts', "export { open } from '../daemon/store/open.ts';"],
    ['daemon/a.ts', "const { faults } = await import('../test/support/faults.ts');"],
    ['sample-feeds/a.ts', "import { open } from '../daemon/store/open.ts';"],
    ['daemon/a.ts', "import { policy } from '../alerts/policy.js';"],
  ])('wrong way: %s %s', (path, text) => expect(wrongWayImports(planted(path, text))).toHaveLength(1));

  test('circles', () => {
    const loop = ['a', 'b', 'c'].map((name, i) =>
      parseSource(`daemon/${name}.ts`, `import { x } from './${['b', 'c', 'a'][i]}.ts';`),
    );
    expect(importCycles(loop)).toEqual(['daemon/a.ts → daemon/b.ts → daemon/c.ts']);
    expect(importCycles(loop.slice(0, 2))).toEqual([]);
    const types = parseSource('daemon/c.ts', "import type { X } from './a.ts';");
    expect(importCycles([...loop.slice(0, 2), types])).toEqual([]);
  });

  test.each([
    'export const f = () => Date.now();',
    'export const f = () => new Date();',
    'export const f = () => Math.random();',
    'export const f = () => globalThis.performance;',
    'export const f = () => { console.warn(1); };',
    "export const f = () => process.env['TZ'];",
    'export const f = () => setTimeout(f, 1);',
    'let calls = 0; export const f = () => ++calls;',
    'export let calls = 0;',
  ])('impure: %s', (text) => expect(impurities(planted('detectors/a.ts', text))).toHaveLength(1));

  test('pure: members, keys and types of the same name', () => {
    const text =
      'interface Visit { process: number; on: Date } export const f = (v: Visit) => ({ console: v.process });';
    expect(impurities(planted('detectors/a.ts', text))).toEqual([]);
  });

  test.each([
    ['daemon/pipeline.ts', "import Database from 'better-sqlite3';"],
    ['daemon/store/open.ts', "import { watch } from 'chokidar';"],
    ['daemon/lifecycle.ts', "import cron from 'node-cron';"],
    ['alerts/message.ts', "import { createTransport } from 'nodemailer';"],
    ['alerts/digest.ts', "import { connect } from 'node:net';"],
    ['alerts/digest.ts', "import { request } from 'node:https';"],
    ['daemon/cli.ts', "import { Hono } from 'hono';"],
  ])('out of its room: %s %s', (path, text) => expect(outOfRoom(planted(path, text))).toHaveLength(1));

  test('SQL', () => {
    const text = "export const q = 'SELECT id FROM arrivals'; export const r = `UPDATE files SET fault = 1`;";
    expect(sqlOutsideTheStore(planted('daemon/pipeline.ts', text))).toHaveLength(2);
    expect(sqlOutsideTheStore(planted('daemon/store/arrivals.ts', text))).toEqual([]);
    expect(sqlOutsideTheStore(planted('daemon/cli.ts', "export const help = 'Select a feed from the list';"))).toEqual(
      [],
    );
  });

  test('clock', () => {
    const text = 'export const a = Date.now(); export const b = new Date(); export const c = new Date(a);';
    expect(clockReaders(planted('daemon/a.ts', text))).toHaveLength(2);
    expect(clockReaders(planted('daemon/clock.ts', text))).toEqual([]);
  });

  test('sizes', () => {
    const body = 'x += 1;\n'.repeat(LONGEST_FUNCTION);
    const text = `export function f(x: number): number {\n${body}return x; }`;
    expect(tooLong(planted('daemon/a.ts', text))).toHaveLength(1);
    expect(tooLarge(planted('daemon/a.ts', `${text}\n// ${'x'.repeat(LARGEST_FILE)}`))).toHaveLength(1);
    expect([
      tooLong(planted('daemon/a.ts', 'export const f = () => 1;')),
      tooLarge(planted('daemon/a.ts', '')),
    ]).toEqual([[], []]);
  });
});
