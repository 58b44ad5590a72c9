import { createHash } from 'node:crypto';
import type { MailSetting } from '../alerts/index.ts';
import { detectorSettings } from '../detectors/index.ts';
import type { DetectorSettings } from '../detectors/report.ts';
import type { SiteOnEarth, SkyTables } from '../detectors/sky/barycentre.ts';
import type { SpkKernel } from '../detectors/sky/spkKernel.ts';
import { BUILT_IN_EPHEMERIS, type PulsarModel } from '../detectors/spin/pulsarModel.ts';
import type { Clock } from './clock.ts';
import type { Configuration, EarthSettings } from './config/configuration.ts';
import type { Log } from './log.ts';
import type { Store } from './store/index.ts';

/** Everything that the stages of the pipeline work with: what the operator set, the sky, the record, the clock. */
export interface Station {
  readonly configuration: Configuration;
  readonly store: Store;
  /** With what the operator set in [earth]. For the arrivals of a pulsar: `tablesOf`. */
  readonly tables: SkyTables;
  readonly clock: Clock;
  readonly log: Log;
  /** For mail: who speaks. The address of the review page is known once it listens. */
  readonly reviewUrl: () => string | null;
  readonly sites: ReadonlyMap<string, SiteOnEarth>;
  /** The tables with the ephemeris that the pulsar's model was fitted with. */
  tablesOf(model: PulsarModel): SkyTables;
  settingsOf(model: PulsarModel): DetectorSettings;
  /** A digest of everything that a pulsar's decisions rest on besides its arrivals: another value means: decide again. */
  basisOf(model: PulsarModel): string;
}

/** Grows when a change of the program makes old decisions worth taking again. */
const DECISIONS_VERSION = 2;

export function createStation(
  parts: Pick<Station, 'configuration' | 'store' | 'tables' | 'clock' | 'log' | 'reviewUrl'>,
): Station {
  const { configuration } = parts;
  const { earth } = configuration;
  const tables: SkyTables = { ...parts.tables, orientation: earth.orientation, ttBipm: earth.ttBipm };
  const tablesOf = (model: PulsarModel): SkyTables => {
    const kernel = kernelOf(earth, model);
    return kernel === null ? tables : { ...tables, earthSun: kernel };
  };
  const sites = new Map(configuration.sites.map((site) => [site.name, { itrfM: site.itrfM, clock: site.clockTable }]));
  const sky = digestOf([DECISIONS_VERSION, [...sites], tables.leapSeconds, tables.orientation, tables.ttBipm]);
  const kernels = [...earth.kernels.values()];
  const kernelDigests = new Map(kernels.map((kernel) => [kernel, digestOf(kernel.segments)]));
  const settings = new Map<string, DetectorSettings>();
  const settingsOf = (model: PulsarModel): DetectorSettings => {
    let found = settings.get(model.name);
    if (found === undefined) {
      found = detectorSettings(configuration.budget.falseAlertsPerYear, configuration.models.size, model);
      settings.set(model.name, found);
    }
    return found;
  };
  const basisOf = (model: PulsarModel): string => {
    const kernel = kernelOf(earth, model);
    return digestOf([sky, kernel && kernelDigests.get(kernel), model, settingsOf(model)]);
  };
  return { ...parts, tables, sites, tablesOf, settingsOf, basisOf };
}

/** Null: the built-in table. */
function kernelOf(earth: EarthSettings, { name, ephemeris }: PulsarModel): SpkKernel | null {
  if (ephemeris === undefined) return earth.kernel;
  if (ephemeris === BUILT_IN_EPHEMERIS) return null;
  const kernel = earth.kernels.get(ephemeris);
  if (kernel === undefined) throw new Error(`${name}: the kernel ${ephemeris} was not read with the configuration`);
  return kernel;
}

export function mailSetting(station: Station): MailSetting {
  const { observatory, mail } = station.configuration;
  return {
    observatory,
    from: mail.from,
    timezone: mail.timezone,
    reviewUrl: station.reviewUrl()?.replace(/\/$/, '') ?? null,
    now: station.clock.now(),
  };
}

function digestOf(parts: unknown): string {
  return shortDigest(JSON.stringify(parts, (_, value) => (value instanceof Float64Array ? shortDigest(value) : value)));
}

function shortDigest(content: string | Float64Array): string {
  return createHash('sha256').update(content).digest('hex').slice(0, 24);
}
