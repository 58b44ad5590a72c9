import type { QuietHours } from '../../alerts/index.ts';
import type { EarthOrientationTable } from '../../detectors/sky/earthOrientation.ts';
import type { SpkKernel } from '../../detectors/sky/spkKernel.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import type { Explanation } from '../../detectors/steps/pulsarEvent.ts';
import type { ClockTable } from '../../detectors/time/siteClock.ts';
import type { TtBipmTable } from '../../detectors/time/ttBipm.ts';
import type { Layout } from '../intake/layouts/read.ts';
import type { TextColumns } from '../intake/layouts/textColumns.ts';
import type { HeartbeatSettings } from './heartbeatSettings.ts';
import type { ReviewSettings } from './reviewSettings.ts';

/** The whole of what the operator set: `spinvigil.toml`, the models folder and the clock tables, checked and frozen. Paths are absolute. */
export interface Configuration {
  readonly file: string;
  readonly observatory: { readonly name: string; readonly contact: string };
  readonly stateFolder: string;
  readonly earth: EarthSettings;
  readonly sites: readonly Site[];
  readonly feeds: readonly Feed[];
  readonly modelsFolder: string;
  /** Where the current model of each pulsar is written for others; null: nowhere. */
  readonly currentModelsFolder: string | null;
  readonly models: ReadonlyMap<string, PulsarModel>;
  readonly budget: { readonly falseAlertsPerYear: number };
  readonly mail: MailSettings;
  readonly review: ReviewSettings;
  readonly heartbeat: HeartbeatSettings;
}

/** Tables that the operator keeps beside the built-in ones. */
export interface EarthSettings {
  readonly orientation: EarthOrientationTable | null;
  readonly ttBipm: TtBipmTable | null;
  /** Earth and Sun for the pulsars whose models name no ephemeris; null: the built-in table. */
  readonly kernel: SpkKernel | null;
  /** Every kernel that was read, by the path under which it was named. */
  readonly kernels: ReadonlyMap<string, SpkKernel>;
}

export interface Site {
  readonly name: string;
  readonly itrfM: readonly [number, number, number];
  readonly clockTable: ClockTable | null;
}

export interface Feed {
  readonly name: string;
  readonly folder: string;
  readonly layout: Layout['layout'];
  /** How a text table is to be read, in layout `columns`; null in the others. */
  readonly columns: TextColumns | null;
  readonly recursive: boolean;
  /** Seconds between scans. */
  readonly pollSeconds: number;
  /** The operator said how often to look (a network file system): no notices are asked for. */
  readonly polling: boolean;
  /** A feed silent for longer is reported; null: never. */
  readonly expectEveryHours: number | null;
}

export interface MailSettings {
  readonly transport: SmtpTransport | FolderTransport;
  readonly from: string;
  readonly to: readonly string[];
  /** IANA zone, for the digest and the dates in mails. */
  readonly timezone: string;
  readonly digestCron: string;
  /** An event that an arrival older than this confirms is shown in the digest and mailed to nobody. */
  readonly historicalAfterDays: number;
  /** An update is mailed when a quantity is known so many times as well as the last mail said. */
  readonly updateWhenSharperBy: number;
  /** Suspected events are mailed too. */
  readonly mailSuspected: boolean;
  /** When event mail is held unless the event is large; null: never. */
  readonly quietHours: QuietHours | null;
  /** Event mails beyond so many an hour become one summary. */
  readonly mostPerHour: number;
  /** Who wants mail about some events beside `to`. */
  readonly alsoTo: readonly AlsoTo[];
}

/** Recipients of the events of some kinds, of some pulsars, or of both at once; an empty list: of all. */
export interface AlsoTo {
  readonly to: readonly string[];
  readonly explanations: readonly Explanation[];
  readonly pulsars: readonly string[];
}

export interface SmtpTransport {
  readonly kind: 'smtp';
  readonly host: string;
  readonly port: number;
  /** `tls`: from the first byte; `starttls`: required after the greeting; `none`: loopback only. */
  readonly secure: 'tls' | 'starttls' | 'none';
  readonly user: string | null;
  /** Read anew at each login, so that a rotated password is picked up. */
  readonly passwordFile: string | null;
}

export interface FolderTransport {
  readonly kind: 'folder';
  readonly folder: string;
}

/** One complaint about the configuration, for the person at the keyboard. */
export interface ConfigProblem {
  readonly file: string;
  readonly line: number | null;
  readonly column: number | null;
  readonly message: string;
  readonly severity: 'error' | 'warning';
}
