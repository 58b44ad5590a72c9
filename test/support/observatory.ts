import { mkdir, mkdtemp, rename, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { modelFile, type SyntheticPulsar } from './syntheticPulsar.ts';

/** A whole invented observatory in a temporary folder: configuration, models, one feed. */
export interface TestObservatory {
  readonly folder: string;
  readonly configFile: string;
  readonly feedFolder: string;
  readonly stateFolder: string;
  readonly mailFolder: string;
  /** Puts a file into the feed as a careful producer does: whole at once. */
  drop(name: string, content: string): Promise<void>;
  addModel(pulsar: SyntheticPulsar): Promise<void>;
  remove(): Promise<void>;
}

export interface ObservatoryOptions {
  readonly pulsars: readonly SyntheticPulsar[];
  /** A mail server on loopback; absent: mail goes to the folder `mail`. */
  readonly smtpPort?: number;
  readonly expectEveryHours?: number;
  readonly to?: readonly string[];
  readonly timezone?: string;
  readonly digestCron?: string;
  /** Further lines of `[mail]`. */
  readonly mailKeys?: readonly string[];
}

/**
 * A digest on a day of the month half a month away: for programs that run by the machine's own clock and count their mail, so that
 * the hour of the test makes no difference.
 */
export function digestFarAway(now = new Date()): string {
  const day = ((now.getUTCDate() + 13) % 28) + 1;
  return `0 8 ${day} * *`;
}

export async function createObservatory(options: ObservatoryOptions): Promise<TestObservatory> {
  const folder = await mkdtemp(join(tmpdir(), 'spinvigil-test-'));
  const at = (name: string) => join(folder, name);
  for (const name of ['arrivals', 'models', 'mail', 'staging']) await mkdir(at(name));
  for (const [i, pulsar] of options.pulsars.entries()) await writeFile(at(`models/${i}.toml`), modelFile(pulsar));
  await writeFile(at('spinvigil.toml'), configuration(options));
  return {
    folder,
    configFile: at('spinvigil.toml'),
    feedFolder: at('arrivals'),
    stateFolder: at('state'),
    mailFolder: at('mail'),
    async drop(name, content) {
      await writeFile(join(at('staging'), name), content);
      await rename(join(at('staging'), name), join(at('arrivals'), name));
    },
    addModel: (pulsar) => writeFile(at(`models/added-${pulsar.name.replace(/\W/g, '')}.toml`), modelFile(pulsar)),
    remove: () => rm(folder, { recursive: true, force: true }),
  };
}

function configuration(options: ObservatoryOptions): string {
  const transport =
    options.smtpPort === undefined
      ? 'transport = "folder"\nfolder = "mail"'
      : `transport = "smtp"\nhost = "127.0.0.1"\nport = ${options.smtpPort}\nsecure = "none"`;
  const expect = options.expectEveryHours === undefined ? '' : `expect_every_hours = ${options.expectEveryHours}\n`;
  return `[observatory]
name = "Kestrel Ridge"
contact = "timing@kestrel-ridge.example"
[state]
folder = "state"
[[feed]]
name = "nightly"
folder = "arrivals"
layout = "csv"
poll_seconds = 1
${expect}[models]
folder = "models"
[budget]
false_alerts_per_year = 1.0
[mail]
${transport}
from = "spinvigil@kestrel-ridge.example"
to = ${JSON.stringify(options.to ?? ['duty@kestrel-ridge.example'])}
timezone = "${options.timezone ?? 'Europe/Berlin'}"
digest_cron = "${options.digestCron ?? '0 8 * * *'}"
${(options.mailKeys ?? []).join('\n')}
[review]
listen = "127.0.0.1:0"
reviewers = ["duty"]
`;
}
