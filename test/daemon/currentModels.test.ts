import { existsSync } from 'node:fs';
import { mkdir, readdir, readFile, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { ConfigProblem } from '../../daemon/config/configuration.ts';
import { loadConfiguration } from '../../daemon/config/loadConfiguration.ts';
import { loadModels } from '../../daemon/config/models.ts';
import { modelOfDate } from '../../daemon/stages/currentModels.ts';
import { modelFileName } from '../../daemon/stages/modelFiles.ts';
import { createKernelShelf } from '../../daemon/tables/kernelFile.ts';
import { phaseEvaluator } from '../../detectors/index.ts';
import { parseMjd } from '../../detectors/time/mjd.ts';
import { createObservatory } from '../support/observatory.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// The current model as the daemon hands it out: written to the operator's folder, and as it was at earlier dates.

const START = 61_000;
const GLITCH = START + 129;
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: GLITCH, deltaNuOverNu: 2e-7 }],
});
const all = syntheticArrivals(pulsar, { fromMjd: START + 1, toMjd: START + 180, everyDays: 3, seed: 3 });
const until = (mjd: number) => all.filter(({ mjdText }) => Number(mjdText) <= mjd);
const between = (from: number, to: number) =>
  all.filter(({ mjdText }) => Number(mjdText) > from && Number(mjdText) <= to);
const NOW = '2026-04-22T08:00:00.000Z';
/** 50 µs at 3.12 Hz. */
const SIGMA = 1.6e-4;

const open: TestStation[] = [];
let glitched: Awaited<ReturnType<typeof station>>;
beforeAll(async () => {
  glitched = await station();
  open.push(glitched.at);
  await glitched.at.deliver('a.csv', arrivalFile(until(START + 150)));
}, 120_000);
afterAll(async () => {
  for (const station of open) await station.close();
});
const startModel = () => glitched.at.station.configuration.models.get(pulsar.name)!;

/** A station whose configuration has `write_folder`. */
async function station(): Promise<{ readonly at: TestStation; readonly folder: string }> {
  const plain = await createTestStation({ pulsars: [pulsar], now: NOW });
  const folder = join(plain.station.configuration.modelsFolder, '..', 'current');
  const at = plain.restart({ ...plain.station.configuration, currentModelsFolder: folder });
  return { at, folder };
}

function modelIn(folder: string) {
  const problems: ConfigProblem[] = [];
  const model = loadModels(folder, createKernelShelf(), problems)?.get(pulsar.name);
  expect(problems.filter(({ severity }) => severity === 'error')).toEqual([]);
  return model!;
}

function largestDeviation(model: Parameters<typeof phaseEvaluator>[0], arrivals: typeof all): number {
  const phaseAt = phaseEvaluator(model);
  return Math.max(...arrivals.map(({ mjdText }) => Math.abs(phaseAt(parseMjd(mjdText)!).deviationTurns)));
}

describe('the folder of current models', () => {
  test('gets the post-glitch model, which folds the arrivals that come after it', async () => {
    const { folder } = glitched;
    expect((await readdir(folder)).sort()).toEqual(['KR_0417+31.json', 'KR_0417+31.toml']);
    const later = between(START + 150, START + 165);
    expect(later.length).toBeGreaterThan(3);
    expect(largestDeviation(modelIn(folder), later)).toBeLessThan(0.02);
    // The start model is off by 2e-7 of 3.12 Hz: turns within three weeks.
    expect(largestDeviation(startModel(), later)).toBeGreaterThan(0.2);
    const json = JSON.parse(await readFile(join(folder, 'KR_0417+31.json'), 'utf8')) as Record<string, unknown>;
    expect(json).toMatchObject({ pulsar: 'KR 0417+31', timeScale: 'TDB', locked: true });
    expect(json['frequencyHz']).toMatch(/^3\.1234/);
    const toml = await readFile(join(folder, 'KR_0417+31.toml'), 'utf8');
    expect(toml).toMatch(/^# KR 0417\+31: .*\n(# .*\n)*# Holds candidate glitch /);
  });

  test('that cannot be written stops nothing', async () => {
    const { at, folder } = await station();
    open.push(at);
    await writeFile(folder, 'a file stands in the way');
    await at.deliver('a.csv', arrivalFile(until(START + 60)));
    expect(at.store.arrivals(pulsar.name)).toHaveLength(until(START + 60).length);
  });

  test('keeps names apart that would share a file', () => {
    expect(modelFileName('KR 1', ['KR 1', 'KR 2'])).toBe('KR_1');
    const twins = ['KR 1', 'KR_1'];
    expect(modelFileName('KR 1', twins)).not.toBe(modelFileName('KR_1', twins));
  });

  test('may be neither a feed nor the models folder, nor lie in one: it is refused', async () => {
    const at = await createObservatory({ pulsars: [pulsar] });
    try {
      const text = await readFile(at.configFile, 'utf8');
      const problemsWith = async (folder: string) => {
        await writeFile(at.configFile, text.replace('[models]', `[models]\nwrite_folder = "${folder}"`));
        return loadConfiguration(at.configFile).problems.map(({ message }) => message);
      };
      await mkdir(join(at.folder, 'models', 'inner'));
      for (const folder of ['arrivals', 'arrivals/x', 'models', 'models/inner', 'state', '.']) {
        expect((await problemsWith(folder)).join('\n'), folder).toMatch(/write_folder|keep them apart|is the same as/);
      }
      expect(await problemsWith('current')).toEqual([]);
      expect(existsSync(join(at.folder, 'current'))).toBe(false);
    } finally {
      await at.remove();
    }
  });
});

describe('the model of an earlier date', () => {
  test('is that of its side of the glitch, also between the glitch and its confirmation', () => {
    const { station } = glitched.at;
    const before = modelOfDate(station, startModel(), GLITCH - 2)!;
    expect(before.events).toEqual([]);
    expect(largestDeviation(before.current.model, between(GLITCH - 40, GLITCH))).toBeLessThan(10 * SIGMA);
    const after = modelOfDate(station, startModel(), GLITCH + 1)!;
    expect(after.events).toHaveLength(1);
    expect(largestDeviation(after.current.model, between(GLITCH, START + 150))).toBeLessThan(10 * SIGMA);
  });
});

// Last: it takes the glitch back.
describe('when the event is taken back', () => {
  test('the model before it is written again', async () => {
    const quietly = syntheticArrivals(
      { ...pulsar, glitches: [] },
      { fromMjd: START + 1, toMjd: START + 150, everyDays: 3, seed: 3 },
    );
    await glitched.at.deliver('a.csv', arrivalFile(quietly));
    expect(modelIn(glitched.folder).glitches).toEqual([]);
    expect(largestDeviation(modelIn(glitched.folder), quietly)).toBeLessThan(10 * SIGMA);
  });
});
