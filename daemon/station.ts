import { createHash } from 'node:crypto';
import type { MailSetting } from '../alerts/index.ts';
import { detectorSettings } from '../detectors/index.ts';
import type { DetectorSettings } from '../detectors/report.ts';
import type { SiteOnEarth, SkyTables } from '../detectors/sky/barycentre.ts';
import type { PulsarModel } from '../detectors/spin/pulsarModel.ts';
import type { Clock } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import type { Log } from './log.ts';
import type { Store } from './store/index.ts';

/** Everything that the stages of the pipeline work with: what the operator set, the sky, the record, the clock. */
export interface Station {
  readonly configuration: Configuration;
  readonly store: Store;
  readonly tables: SkyTables;
  readonly clock: Clock;
  readonly log: Log;
  /** For mail: who speaks. The address of the review page is known once it listens. */
  readonly reviewUrl: () => string | null;
  readonly sites: ReadonlyMap<string, SiteOnEarth>;
  settingsOf(model: PulsarModel): DetectorSettings;
  /** A digest of everything that a pulsar's decisions rest on besides its arrivals: another value means: decide again. */
  basisOf(model: PulsarModel): string;
}

/** Grows when a change of the program makes old decisions worth taking again. */
const DECISIONS_VERSION = 1;

export function createStation(
  parts: Pick<Station, 'configuration' | 'store' | 'tables' | 'clock' | 'log' | 'reviewUrl'>,
): Station {
  const { configuration, tables } = parts;
  const sites = new Map(configuration.sites.map((site) => [site.name, { itrfM: site.itrfM, clock: site.clockTable }]));
  const sky = digestOf([DECISIONS_VERSION, [...sites], tables.leapSeconds, tables.orientation]);
  const settings = new Map<string, DetectorSettings>();
  const settingsOf = (model: PulsarModel): DetectorSettings => {
    let found = settings.get(model.name);
    if (found === undefined) {
      found = detectorSettings(configuration.budget.falseAlertsPerYear, configuration.models.size, model);
      settings.set(model.name, found);
    }
    return found;
  };
  return { ...parts, sites, settingsOf, basisOf: (model) => digestOf([sky, model, settingsOf(model)]) };
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
  return createHash('sha256').update(JSON.stringify(parts)).digest('hex').slice(0, 24);
}
