import { mkdirSync, symlinkSync, writeFileSync } from 'node:fs';
import { basename, join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { systemClock } from '../../../daemon/clock.ts';
import { loadConfiguration } from '../../../daemon/config/loadConfiguration.ts';
import { silentLog } from '../../../daemon/log.ts';
import { bringToBarycentre } from '../../../daemon/stages/arrival.ts';
import { createStation, type Station } from '../../../daemon/station.ts';
import type { Store } from '../../../daemon/store/index.ts';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { endedTableWarnings } from '../../../daemon/tables/tableEnds.ts';
import { daysBetween } from '../../../detectors/time/mjd.ts';
import { builtInArrays } from '../../support/builtInKernel.ts';
import { CONFIGURATION, PULSAR, writeConfiguration } from '../../support/configurationFolder.ts';
import { arrivalAt } from '../../support/sky.ts';
import { spkFile } from '../../support/spkFile.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();

const ORIENTATION = `1962   1   1  37665  -0.012700   0.213000   0.0326338   0.0017230   0.000000   0.000000
1962   1   2  37666  -0.015900   0.214100   0.0320547   0.0016690   0.000000   0.000000
`;
/** Made-up values of the right size. */
const TT_BIPM = 'mjd,tt_bipm_minus_tt_tai_us\n58000,27.66\n58500,27.67\n';
const KERNEL = spkFile(builtInArrays(58_000, 58_100));
const SHIFTED = spkFile(builtInArrays(58_000, 58_100, { shiftKm: 300 }));

function earth(
  keys: string,
  { models = {} as Record<string, string>, files = {} as Record<string, string | Uint8Array> } = {},
) {
  const folder = newFolder();
  const file = writeConfiguration(folder, {
    configuration: `${CONFIGURATION}[earth]\n${keys}\n`,
    models: { 'a.toml': PULSAR, ...models },
  });
  for (const [name, content] of Object.entries(files)) {
    mkdirSync(join(folder, name, '..'), { recursive: true });
    writeFileSync(join(folder, name), content);
  }
  return { folder, ...reload(file), reload: () => reload(file) };
}

function reload(file: string) {
  const { configuration, problems } = loadConfiguration(file);
  const complaints = problems.map(
    ({ file: where, line, message, severity }) => `${basename(where)}:${line} ${severity} ${message}`,
  );
  return { configuration, complaints };
}

const { tables } = loadTables({ hostLeapSecondFiles: [] });

function stationOf(configuration: ReturnType<typeof reload>['configuration']): Station {
  if (configuration === null) throw new Error('there is no configuration');
  const store = null as unknown as Store; // Nothing here asks the record.
  return createStation({ configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null });
}

/** What a pulsar's decisions rest on. */
function basis(configuration: ReturnType<typeof reload>['configuration'], pulsar: string): string {
  return stationOf(configuration).basisOf(configuration!.models.get(pulsar)!);
}

const named = (name: string, ephemeris: string | null) =>
  PULSAR.replace('KR 0417+31', name).replace(
    'ephemeris = "built-in"',
    ephemeris === null ? '' : `ephemeris = "${ephemeris}"`,
  );

describe('the section [earth]', () => {
  it('loads what it names', () => {
    const { configuration, complaints } = earth(
      'orientation_file = "c04.txt"\ntt_bipm_file = "bipm.csv"\nkernel_file = "k.bsp"',
      {
        files: { 'c04.txt': ORIENTATION, 'bipm.csv': TT_BIPM, 'k.bsp': KERNEL },
      },
    );
    expect(complaints).toEqual([]);
    expect([...configuration!.earth.orientation!.mjdUtc]).toEqual([37_665, 37_666]);
    expect(configuration!.earth.ttBipm!.addSeconds[0]).toBeCloseTo(27.66e-6, 15);
    expect(configuration!.earth.kernel!.segments.map(({ target }) => target)).toEqual([3, 399, 10]);
  });

  it.each([
    ['orientation_file = "none"', {}, /^spinvigil.toml:\d+ error earth, orientation_file: \S+none does not exist$/],
    ['kernel_file = "none"', {}, /^spinvigil.toml:\d+ error earth, kernel_file: \S+none does not exist$/],
    ['kernel_file = "models"', {}, /error earth, kernel_file: \S+models is not a regular file$/],
    ['kernel_file = "x"', { x: 'y'.repeat(2000) }, /error earth, kernel_file: \S+x is not an SPK kernel/],
    ['orientation_file = "c"', { c: `${ORIENTATION}1962 1 2 oops` }, /^c:3 error not a row of finals2000A or EOP C04$/],
    ['orientation_file = "c"', { c: '<html>' }, /^c:null error no row of finals2000A or EOP C04 in it$/],
    [
      'tt_bipm_file = "b"',
      { b: TT_BIPM.replace('27.67', '27670') },
      /^b:3 error a correction of 27670 µs is more than 1000 µs$/,
    ],
    [
      'tt_bipm_file = "b"',
      { b: 'mjd,add_seconds\n1,2\n' },
      /^b:1 error the first row must be the header "mjd,tt_bipm_minus_tt_tai_us"/,
    ],
    ['kernel = "x"', {}, /error earth, kernel: unknown key; did you mean "kernel_file"\?$/],
  ])('%s: says what is wrong, and where', (keys, files, message) => {
    const { configuration, complaints } = earth(keys, { files });
    expect(configuration).toBeNull();
    expect(complaints).toEqual([expect.stringMatching(message)]);
  });
});

describe('ephemerides', () => {
  const models = {
    'b.toml': named('KR 0002+02', null),
    'c.toml': named('KR 0003+03', '../own.bsp'),
    'd.toml': named('KR 0004+04', '../link.bsp'),
  };

  it('each pulsar has the one it names, else that of all, else the built-in; a file is read once', () => {
    const files = { 'all.bsp': KERNEL, 'own.bsp': SHIFTED };
    const { folder, reload: again } = earth('kernel_file = "all.bsp"', { models, files });
    symlinkSync('own.bsp', join(folder, 'link.bsp'));
    const { configuration, complaints } = again();
    expect(complaints).toEqual([]);
    const { kernels, kernel } = configuration!.earth;
    const ephemeris = (name: string) => configuration!.models.get(name)!.ephemeris;
    expect(ephemeris('KR 0417+31')).toBe('built-in');
    expect(ephemeris('KR 0002+02')).toBeUndefined();
    expect(kernel!.name).toBe(join(folder, 'all.bsp'));
    expect(kernels.get(ephemeris('KR 0003+03')!)).toBe(kernels.get(ephemeris('KR 0004+04')!));
    expect(new Set(kernels.values()).size).toBe(2);
  });

  it('a kernel that cannot be used is an error of the model, at its line', () => {
    const { complaints } = earth('', { models: { 'b.toml': named('KR 0002+02', '../none.bsp') } });
    expect(complaints).toEqual([
      expect.stringMatching(
        /^b.toml:10 error spin, ephemeris: \S+none.bsp does not exist; write "built-in" or the path of an SPK kernel$/,
      ),
    ]);
  });

  it('arrivals are timed with it, and marked where a table does not reach', () => {
    const { configuration } = earth('kernel_file = "all.bsp"\norientation_file = "c04.txt"', {
      models: { 'b.toml': named('KR 0002+02', null), 'c.toml': named('KR 0003+03', '../own.bsp') },
      files: { 'all.bsp': KERNEL, 'own.bsp': SHIFTED, 'c04.txt': ORIENTATION },
    });
    const station = stationOf(configuration);
    const timed = (pulsar: string, text: string) => bringToBarycentre(station, { ...arrivalAt(text, 1400), pulsar });
    const tdb = (pulsar: string) => timed(pulsar, '58050.3').barycentred!.tdb;
    expect(daysBetween(tdb('KR 0002+02'), tdb('KR 0417+31'))).toBeCloseTo(0, 15);
    expect(Math.abs(daysBetween(tdb('KR 0003+03'), tdb('KR 0417+31')) * 86_400)).toBeGreaterThan(1e-4);
    expect(timed('KR 0002+02', '58050.3')).toMatchObject({
      quality: 'extrapolated',
      qualityReasons: [expect.stringMatching(/^Earth orientation table \S+c04.txt ended at MJD 37666/)],
    });
    expect(timed('KR 0002+02', '58500.3')).toMatchObject({
      barycentred: null,
      quality: 'unusable',
      qualityReasons: [expect.stringMatching(/^MJD 58500 is outside what the kernel \S+all.bsp holds for the Earth/)],
    });
    expect(timed('KR 0417+31', '58500.3').quality).toBe('extrapolated');
  });

  it('another content of a file makes those pulsars be decided about again that it concerns', () => {
    const keys = 'kernel_file = "all.bsp"\norientation_file = "c04.txt"\ntt_bipm_file = "bipm.csv"';
    const files = {
      'all.bsp': KERNEL,
      'own.bsp': KERNEL,
      'link.bsp': KERNEL,
      'c04.txt': ORIENTATION,
      'bipm.csv': TT_BIPM,
    };
    const { folder, configuration, reload: again } = earth(keys, { models, files });
    const pulsars = ['KR 0417+31', 'KR 0002+02', 'KR 0003+03'];
    const changedBy = (name: string, content: string | Uint8Array) => {
      const before = pulsars.map((pulsar) => basis(configuration, pulsar));
      writeFileSync(join(folder, name), content);
      const now = again();
      expect(now.complaints).toEqual([]);
      writeFileSync(join(folder, name), files[name as keyof typeof files]);
      return pulsars.map((pulsar, i) => basis(now.configuration, pulsar) !== before[i]);
    };
    expect(changedBy('all.bsp', KERNEL)).toEqual([false, false, false]);
    expect(changedBy('all.bsp', SHIFTED)).toEqual([false, true, false]);
    expect(changedBy('own.bsp', SHIFTED)).toEqual([false, false, true]);
    expect(changedBy('c04.txt', ORIENTATION.replace('0.0320547', '0.0320548'))).toEqual([true, true, true]);
    expect(changedBy('bipm.csv', TT_BIPM.replace('27.67', '27.68'))).toEqual([true, true, true]);
  });
});

describe('tables that ended', () => {
  it('are warned of when their publisher should have come out with a newer one', () => {
    const { configuration } = earth('orientation_file = "c04.txt"\ntt_bipm_file = "bipm.csv"', {
      files: { 'c04.txt': ORIENTATION, 'bipm.csv': TT_BIPM },
    });
    const starts = (mjd: number) => endedTableWarnings(configuration!, mjd).map((text) => text.split(':')[0]);
    expect(starts(37_710)).toEqual([]);
    expect(starts(37_711)).toEqual(['the Earth orientation file ends at MJD 37666, 45 days ago']);
    expect(starts(58_899)).not.toContain('the TT(BIPM) table ends at MJD 58500, 399 days ago');
    expect(starts(61_012)).toEqual([
      'the clock table of ridge ends at MJD 61000, 12 days ago',
      'the Earth orientation file ends at MJD 37666, 23346 days ago',
      'the TT(BIPM) table ends at MJD 58500, 2512 days ago',
    ]);
  });
});
