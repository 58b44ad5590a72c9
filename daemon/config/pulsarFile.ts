import { dirname, resolve } from 'node:path';
import type { z } from 'zod';
import {
  type AlertSettings,
  BUILT_IN_EPHEMERIS,
  type KnownGlitch,
  type NoiseSettings,
  type PulsarModel,
  type SpinDown,
} from '../../detectors/spin/pulsarModel.ts';
import { compareMjd } from '../../detectors/time/mjd.ts';
import { modelFromTcb } from './fromTcb.ts';
import { date, decimal, frequency } from './modelNumbers.ts';
import { readOrbit } from './orbit.ts';
import { readPosition } from './position.ts';
import { alertsTable, glitchTable, noiseTable, pulsarTable, recoveryTable, spinTable } from './pulsarSchema.ts';
import { readReceivers } from './receivers.ts';
import type { SectionReader } from './sectionReader.ts';
import type { TomlPath } from './tomlDocument.ts';

/** One pulsar's file as a model in TDB; null after complaints. */
export function readPulsarFile(reader: SectionReader): PulsarModel | null {
  const head = reader.read([], pulsarTable);
  const position = readPosition(reader, head ?? {});
  const spin = readSpin(reader);
  const glitches = readGlitches(reader);
  const receivers = readReceivers(reader);
  const noise = readNoise(reader);
  const alerts = readAlerts(reader);
  const orbit = reader.has(['orbit']) ? readOrbit(reader) : undefined;
  const dispersion = head === null ? null : readDispersion(reader, head);

  if (head === null || position === null) return null;
  const moving = position.properMotionMasPerYr.some((component) => component !== 0);
  if (moving && head.position_epoch_mjd === undefined) {
    reader.error(['position_epoch_mjd'], 'is missing, and the position moves: say at which date it holds');
    return null;
  }
  if (
    dispersion === null ||
    spin === null ||
    glitches === null ||
    receivers === null ||
    noise === null ||
    alerts === null ||
    orbit === null
  ) {
    return null;
  }
  const model: PulsarModel = {
    name: head.name,
    ...position,
    positionEpochMjd: head.position_epoch_mjd ?? spin.model.epochTdb.day,
    parallaxMas: head.parallax_mas,
    ...dispersion,
    ...(spin.ephemeris === null ? {} : { ephemeris: spin.ephemeris }),
    spin: spin.model,
    ...(orbit === undefined ? {} : { orbit }),
    glitches,
    ...(receivers.length === 0 ? {} : { receivers }),
    noise,
    alerts,
  };
  if (spin.timeScale === 'TDB') return model;
  reader.warning(['spin', 'time_scale'], 'the model was turned from TCB into TDB (IAU 2006 resolution B3)');
  return modelFromTcb(model);
}

type Dispersion = Pick<PulsarModel, 'dispersionMeasure' | 'dispersionMeasureSlope' | 'solarWindPerCm3'>;

function readDispersion(reader: SectionReader, head: z.output<typeof pulsarTable>): Dispersion | null {
  const perYr = head.dispersion_measure_derivative_per_yr ?? 0;
  const epochMjd = head.dispersion_measure_epoch_mjd;
  if (perYr !== 0 && epochMjd === undefined) {
    const message = 'is missing, and the dispersion measure changes: say at which date it holds';
    reader.error(['dispersion_measure_epoch_mjd'], message);
    return null;
  }
  return {
    dispersionMeasure: head.dispersion_measure,
    ...(perYr === 0 || epochMjd === undefined ? {} : { dispersionMeasureSlope: { perYr, epochMjd } }),
    ...(head.solar_wind_density_per_cm3 === undefined ? {} : { solarWindPerCm3: head.solar_wind_density_per_cm3 }),
  };
}

interface ReadSpin {
  readonly model: SpinDown;
  readonly timeScale: 'TDB' | 'TCB';
  readonly ephemeris: string | null;
}

function readSpin(reader: SectionReader): ReadSpin | null {
  const table = reader.read(['spin'], spinTable);
  const epochTdb = date(reader, ['spin', 'epoch_mjd']);
  const frequencyHz = frequency(reader, ['spin', 'frequency_hz']);
  const first = decimal(reader, ['spin', 'frequency_derivative'], { size: 1e-7, unit: 'Hz/s' });
  const second = decimal(reader, ['spin', 'frequency_second_derivative'], { size: 1e-15, unit: 'Hz/s²', absent: 0 });
  const higher = (table?.frequency_higher_derivatives ?? []).map((_, i) =>
    decimal(reader, ['spin', 'frequency_higher_derivatives', i], { size: 1e-20, unit: `Hz/s^${i + 3}` }),
  );
  const phase = decimal(reader, ['spin', 'phase_at_epoch_turns'], { size: 1000, unit: 'turns', absent: 0 });
  if (first !== null && first > 0) {
    reader.warning(
      ['spin', 'frequency_derivative'],
      'is positive: the pulsar would spin up, as accreting ones do. Or is this the derivative of the period?',
    );
  }
  if (table === null || epochTdb === null || frequencyHz === null || first === null || second === null) {
    return null;
  }
  if (higher.some((derivative) => derivative === null) || phase === null) return null;
  return {
    timeScale: table.time_scale,
    ephemeris: table.ephemeris === undefined ? null : ephemerisOf(reader, table.ephemeris),
    model: {
      epochTdb,
      frequencyHz,
      frequencyDerivativeHzPerS: first,
      frequencySecondDerivativeHzPerS2: second,
      ...(higher.length === 0 ? {} : { higherFrequencyDerivatives: higher as number[] }),
      ...(phase === 0 ? {} : { phaseAtEpochTurns: phase }),
    },
  };
}

/** Kernels stand beside the model that was fitted with them: their paths start from its folder. */
function ephemerisOf(reader: SectionReader, text: string): string {
  return text === BUILT_IN_EPHEMERIS ? text : resolve(dirname(reader.file), text);
}

function readGlitches(reader: SectionReader): KnownGlitch[] | null {
  const glitches = reader.tablesOf(['glitch']).map((path) => readGlitch(reader, path));
  if (glitches.includes(null)) return null;
  return (glitches as KnownGlitch[]).sort((a, b) => compareMjd(a.epochTdb, b.epochTdb));
}

const MOST_RECOVERIES = 3;

function readGlitch(reader: SectionReader, path: TomlPath): KnownGlitch | null {
  const table = reader.read(path, glitchTable);
  const epochTdb = date(reader, [...path, 'epoch_mjd']);
  const phaseTurns = decimal(reader, [...path, 'phase_turns'], { size: 1000, unit: 'turns', absent: 0 });
  const step = decimal(reader, [...path, 'frequency_step_hz'], { size: 0.1, unit: 'Hz', absent: 0 });
  const derivative = decimal(reader, [...path, 'frequency_derivative_step'], { size: 1e-7, unit: 'Hz/s', absent: 0 });
  const recoveries = reader.tablesOf([...path, 'recovery']).map((at) => readRecovery(reader, at));
  if (table === null || epochTdb === null || phaseTurns === null || step === null || derivative === null) return null;
  if (recoveries.includes(null)) return null;
  if (recoveries.length > MOST_RECOVERIES) {
    reader.error(
      [...path, 'recovery', MOST_RECOVERIES],
      `is one too many: at most ${MOST_RECOVERIES} exponentials are taken`,
    );
    return null;
  }
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
