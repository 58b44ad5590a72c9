import { parseDoubleDouble } from '../../detectors/spin/doubleDouble.ts';
import type {
  AlertSettings,
  DoubleDouble,
  KnownGlitch,
  NoiseSettings,
  PulsarModel,
  SpinDown,
} from '../../detectors/spin/pulsarModel.ts';
import { compareMjd, type Mjd, parseMjd } from '../../detectors/time/mjd.ts';
import { parseDecimal } from '../intake/numbers.ts';
import { parseDeclination, parseRightAscension } from './angles.ts';
import { modelFromTcb } from './fromTcb.ts';
import { alertsTable, glitchTable, noiseTable, pulsarTable, recoveryTable, spinTable } from './pulsarSchema.ts';
import type { SectionReader } from './sectionReader.ts';
import type { TomlPath } from './tomlDocument.ts';

/** One pulsar's file as a model in TDB; null after complaints, or when the pulsar has to be left out. */
export function readPulsarFile(reader: SectionReader): PulsarModel | null {
  const head = reader.read([], pulsarTable);
  const rightAscensionRad = angle(
    reader,
    'right_ascension',
    parseRightAscension,
    '"hh:mm:ss.s" or degrees from 0 to 360',
  );
  const declinationRad = angle(reader, 'declination', parseDeclination, '"±dd:mm:ss.s" or degrees from -90 to 90');
  const spin = readSpin(reader);
  const glitches = readGlitches(reader);
  const noise = readNoise(reader);
  const alerts = readAlerts(reader);
  const bound = reader.has(['orbit']);
  if (bound) reader.warning(['orbit'], 'orbits are not supported yet: arrivals of this pulsar will not be used');

  if (head === null || rightAscensionRad === null || declinationRad === null) return null;
  const moving = head.proper_motion_mas_per_yr.some((component) => component !== 0);
  if (moving && head.position_epoch_mjd === undefined) {
    reader.error(['position_epoch_mjd'], 'is missing, and the position moves: say at which date it holds');
    return null;
  }
  if (spin === null || glitches === null || noise === null || alerts === null || bound) return null;
  const model: PulsarModel = {
    name: head.name,
    rightAscensionRad,
    declinationRad,
    positionEpochMjd: head.position_epoch_mjd ?? spin.model.epochTdb.day,
    properMotionMasPerYr: head.proper_motion_mas_per_yr,
    parallaxMas: head.parallax_mas,
    dispersionMeasure: head.dispersion_measure,
    spin: spin.model,
    glitches,
    noise,
    alerts,
  };
  if (spin.timeScale === 'TDB') return model;
  reader.warning(['spin', 'time_scale'], 'the model was turned from TCB into TDB (IAU 2006 resolution B3)');
  return modelFromTcb(model);
}

function readSpin(reader: SectionReader): { readonly model: SpinDown; readonly timeScale: 'TDB' | 'TCB' } | null {
  const table = reader.read(['spin'], spinTable);
  const otherEphemeris = table !== null && table.ephemeris !== 'built-in';
  if (otherEphemeris) {
    reader.error(
      ['spin', 'ephemeris'],
      'only "built-in" is supported for now; other ephemerides are not supported yet',
    );
  }
  const epochTdb = date(reader, ['spin', 'epoch_mjd']);
  const frequencyHz = frequency(reader, ['spin', 'frequency_hz']);
  const first = decimal(reader, ['spin', 'frequency_derivative'], { size: 1e-7, unit: 'Hz/s' });
  const second = decimal(reader, ['spin', 'frequency_second_derivative'], { size: 1e-15, unit: 'Hz/s²', absent: 0 });
  if (first !== null && first > 0) {
    reader.warning(
      ['spin', 'frequency_derivative'],
      'is positive: the pulsar would spin up. Is this the derivative of the period?',
    );
  }
  if (
    table === null ||
    otherEphemeris ||
    epochTdb === null ||
    frequencyHz === null ||
    first === null ||
    second === null
  ) {
    return null;
  }
  return {
    timeScale: table.time_scale,
    model: {
      epochTdb,
      frequencyHz,
      frequencyDerivativeHzPerS: first,
      frequencySecondDerivativeHzPerS2: second,
    },
  };
}

function readGlitches(reader: SectionReader): KnownGlitch[] | null {
  const glitches = reader.tablesOf(['glitch']).map((path) => readGlitch(reader, path));
  if (glitches.includes(null)) return null;
  return (glitches as KnownGlitch[]).sort((a, b) => compareMjd(a.epochTdb, b.epochTdb));
}

function readGlitch(reader: SectionReader, path: TomlPath): KnownGlitch | null {
  const table = reader.read(path, glitchTable);
  const epochTdb = date(reader, [...path, 'epoch_mjd']);
  const phaseTurns = decimal(reader, [...path, 'phase_turns'], { size: 1000, unit: 'turns', absent: 0 });
  const step = decimal(reader, [...path, 'frequency_step_hz'], { size: 0.1, unit: 'Hz', absent: 0 });
  const derivative = decimal(reader, [...path, 'frequency_derivative_step'], { size: 1e-7, unit: 'Hz/s', absent: 0 });
  const recoveries = reader.tablesOf([...path, 'recovery']).map((at) => readRecovery(reader, at));
  if (table === null || epochTdb === null || phaseTurns === null || step === null || derivative === null) return null;
  if (recoveries.includes(null)) return null;
  return {
    epochTdb,
    phaseTurns,
    frequencyStepHz: step,
    frequencyDerivativeStepHzPerS: derivative,
    recoveries: recoveries as KnownGlitch['recoveries'][number][],
  };
}

function readRecovery(reader: SectionReader, path: TomlPath): KnownGlitch['recoveries'][number] | null {
  const table = reader.read(path, recoveryTable);
  const frequencyStepHz = decimal(reader, [...path, 'frequency_step_hz'], { size: 0.1, unit: 'Hz' });
  const timescaleDays = decimal(reader, [...path, 'timescale_days'], { size: 100_000, unit: 'd' });
  if (table === null || frequencyStepHz === null || timescaleDays === null) return null;
  if (timescaleDays <= 0) {
    reader.error([...path, 'timescale_days'], 'must be larger than 0 d');
    return null;
  }
  return { frequencyStepHz, timescaleDays };
}

function readNoise(reader: SectionReader): NoiseSettings | null {
  if (!reader.has(['noise'])) return {};
  const table = reader.read(['noise'], noiseTable);
  if (table === null) return null;
  return {
    ...(table.uncertainty_scale === undefined ? {} : { uncertaintyScale: table.uncertainty_scale }),
    ...(table.floor_us === undefined ? {} : { floorUs: table.floor_us }),
  };
}

function readAlerts(reader: SectionReader): AlertSettings | null {
  if (!reader.has(['alerts'])) return { extraRecipients: [] };
  const table = reader.read(['alerts'], alertsTable);
  if (table === null) return null;
  return {
    extraRecipients: table.extra_recipients,
    ...(table.confirm_log_odds === undefined ? {} : { confirmLogOdds: table.confirm_log_odds }),
  };
}

function angle(
  reader: SectionReader,
  key: string,
  parse: (text: string) => number | null,
  wanted: string,
): number | null {
  const text = reader.document.textOf([key]);
  if (text === null) return null; // The schema has complained.
  const radians = parse(text);
  if (radians === null) reader.error([key], `must be ${wanted}, found "${text}"`);
  return radians;
}

function date(reader: SectionReader, path: TomlPath): Mjd | null {
  const text = reader.document.textOf(path);
  if (text === null) return null;
  const mjd = parseMjd(text);
  if (mjd !== null && mjd.day >= 30_000 && mjd.day <= 100_000) return mjd;
  reader.error(path, `must be a Modified Julian Date between 30000 and 100000, found "${text}"`);
  return null;
}

/** Slowest known pulsars turn in minutes, the fastest 716 times a second (common practice, no source). */
function frequency(reader: SectionReader, path: TomlPath): DoubleDouble | null {
  const text = reader.document.textOf(path);
  if (text === null) return null;
  const rough = parseDecimal(text);
  if (rough !== null && rough >= 1e-4 && rough <= 2000) return parseDoubleDouble(text);
  reader.error(path, `must be between 0.0001 and 2000 Hz (the frequency, not the period), found "${text}"`);
  return null;
}

function decimal(
  reader: SectionReader,
  path: TomlPath,
  bounds: { readonly size: number; readonly unit: string; readonly absent?: number },
): number | null {
  const text = reader.document.textOf(path);
  if (text === null) return bounds.absent ?? null;
  const value = parseDecimal(text);
  if (value !== null && Math.abs(value) <= bounds.size) return value;
  reader.error(path, `must be a number between -${bounds.size} and ${bounds.size} ${bounds.unit}, found "${text}"`);
  return null;
}
