import { mkdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

/** A sound configuration of the invented observatory; each test breaks it in its own way. */
export const CONFIGURATION = `[observatory]
name = "Kestrel Ridge"
contact = "duty@kestrel.example"
[state]
folder = "state"
[[site]]
name = "ridge"
itrf_m = [-2390490.0, 5564764.0, 1994727.0]
clock_table = "clock/ridge.csv"
[[feed]]
name = "nightly"
folder = "arrivals"
layout = "csv"
[models]
folder = "models"
[budget]
false_alerts_per_year = 1.0
[mail]
transport = "folder"
folder = "mail"
from = "spinvigil@kestrel.example"
to = ["duty@kestrel.example"]
timezone = "UTC"
digest_cron = "0 8 * * *"
[review]
listen = "127.0.0.1:0"
reviewers = ["duty", "timing"]
`;

export const PULSAR = `name = "KR 0417+31"
right_ascension = "04:17:32.114"
declination = "+31:05:09.80"
position_epoch_mjd = 59000
proper_motion_mas_per_yr = [3.1, -7.4]
parallax_mas = 0.8
dispersion_measure = 41.27
[spin]
time_scale = "TDB"
ephemeris = "built-in"
epoch_mjd = "59000.000000"
frequency_hz = "6.3417701123349"
frequency_derivative = "-4.113e-13"
frequency_second_derivative = "0"
`;

export interface ConfigurationFiles {
  readonly configuration?: string;
  /** File name in the models folder → content. */
  readonly models?: Readonly<Record<string, string>>;
  readonly clock?: string;
}

/** Writes all of it; returns the configuration's path. */
export function writeConfiguration(folder: string, files: ConfigurationFiles = {}): string {
  for (const name of ['arrivals', 'models', 'clock']) mkdirSync(join(folder, name), { recursive: true });
  for (const [name, text] of Object.entries(files.models ?? { 'kr0417.toml': PULSAR })) {
    writeFileSync(join(folder, 'models', name), text);
  }
  writeFileSync(join(folder, 'clock', 'ridge.csv'), files.clock ?? 'mjd,add_seconds\n58000,1e-6\n61000,2e-6\n');
  const file = join(folder, 'spinvigil.toml');
  writeFileSync(file, files.configuration ?? CONFIGURATION);
  return file;
}
