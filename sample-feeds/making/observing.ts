import type { SkyTables } from '../../detectors/sky/observer.ts';
import { siteArrival } from '../../detectors/sky/siteArrival.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { addSeconds, type Mjd, mjdNumber, normalMjd } from '../../detectors/time/mjd.ts';
import type { ClockTable } from '../../detectors/time/siteClock.ts';
import { type Chance, chance } from './chance.ts';
import { BAD_SESSION, CLOCK_STEP, DISPERSION_STEP } from './happenings.ts';
import { FIRST_NIGHT_MJD, LONGITUDE_DEG, NIGHTS, type Receiver, SITES, type SiteName } from './observatory.ts';
import type { InventedPulsar, Observation } from './pulsars.ts';
import { degrees, type Truth } from './truth.ts';

/** One arrival as the recorder writes it. */
export interface RecordedArrival {
  readonly pulsar: string;
  readonly reading: Mjd;
  readonly uncertaintyUs: number;
  readonly receiver: Receiver;
}

/** Hours on either side of the meridian within which a session may start: never the same sidereal time twice running. */
const HOUR_ANGLE_RANGE = 2.2;
const SECONDS_BETWEEN_RECEIVERS = 1500;
/** Natural-log scatter of the single uncertainty about the typical one: scintillation. */
const UNCERTAINTY_SCATTER = 0.25;

/** All that the receivers recorded of one pulsar in the 400 nights. */
export function observe(
  pulsar: InventedPulsar,
  truth: Truth,
  tables: SkyTables,
  clocks: ReadonlyMap<SiteName, ClockTable>,
): RecordedArrival[] {
  const sessions = chance(`sessions ${pulsar.name}`);
  const noise = chance(`measurement ${pulsar.name}`);
  const recorded: RecordedArrival[] = [];
  for (let night = 0; night < NIGHTS; night++) {
    const tonight = pulsar.programme.filter(
      ({ everyNights, startNight }) => night % everyNights === startNight % everyNights,
    );
    const start = sessionStart(FIRST_NIGHT_MJD + night, pulsar, sessions);
    for (const [turn, observation] of tonight.entries()) {
      const at = addSeconds(start, turn * SECONDS_BETWEEN_RECEIVERS);
      recorded.push(record({ pulsar, truth, observation, at, night: FIRST_NIGHT_MJD + night, tables, clocks, noise }));
    }
  }
  return recorded;
}

/** UTC, to a few minutes: the hour angle is drawn anyway. Sidereal time: IAU 1982, from memory. */
function sessionStart(day: number, pulsar: InventedPulsar, { even }: Chance): Mjd {
  const greenwichDeg = 280.46061837 + 360.98564736629 * (day - 51_544.5);
  const transitDeg = degrees(pulsar.rightAscension) * 15 - greenwichDeg - LONGITUDE_DEG;
  const transit = (((transitDeg % 360) + 360) % 360) / 360.98564736629;
  return normalMjd(day, transit + ((2 * even() - 1) * HOUR_ANGLE_RANGE) / 24);
}

interface Exposure {
  readonly pulsar: InventedPulsar;
  readonly truth: Truth;
  readonly observation: Observation;
  readonly at: Mjd;
  readonly night: number;
  readonly tables: SkyTables;
  readonly clocks: ReadonlyMap<SiteName, ClockTable>;
  readonly noise: Chance;
}

function record({ pulsar, truth, observation, at, night, tables, clocks, noise }: Exposure): RecordedArrival {
  const { receiver } = observation;
  const emitted = pulseNear(at, truth);
  const passing = addSeconds(emitted, truth.orbitDelayS(emitted));
  const reading =
    receiver.site === 'barycentre'
      ? passing
      : readingOf(passing, modelAt(at, truth.model), { ...receiver, site: receiver.site }, { tables, clocks });
  const uncertaintyUs = observation.uncertaintyUs * Math.exp(UNCERTAINTY_SCATTER * noise.normal());
  const errorUs = uncertaintyUs * pulsar.uncertaintyScale * noise.normal();
  const lateUs = receiver.delayUs + errorUs + mishapUs(pulsar, receiver, reading, night);
  return { pulsar: pulsar.name, reading: addSeconds(reading, lateUs * 1e-6), uncertaintyUs, receiver };
}

/** What the clock of the receiver's site reads when a pulse arrives that passes the barycentre at a given time. */
function readingOf(
  passing: Mjd,
  model: PulsarModel,
  { site, frequencyMhz }: { readonly site: SiteName; readonly frequencyMhz: number },
  { tables, clocks }: Pick<Exposure, 'tables' | 'clocks'>,
): Mjd {
  const place = { itrfM: SITES[site].itrfM, clock: clocks.get(site) ?? null };
  const { reading, quality, reasons } = siteArrival(passing, model, place, frequencyMhz, tables);
  if (quality !== 'ok') throw new Error(`MJD ${mjdNumber(passing)}: ${reasons.join('; ')}`);
  return reading;
}

/** The pulse that passes the barycentre nearest to a given time; of a binary's pulsar, its own barycentre. */
function pulseNear(tdb: Mjd, { turnsPastPulse, frequencyHz }: Truth): Mjd {
  let pulse = tdb;
  for (let round = 0; round < 4; round++) pulse = addSeconds(pulse, -turnsPastPulse(pulse) / frequencyHz);
  return pulse;
}

function modelAt(at: Mjd, model: PulsarModel): PulsarModel {
  if (model.name !== DISPERSION_STEP.pulsar || mjdNumber(at) < DISPERSION_STEP.fromMjd) return model;
  return { ...model, dispersionMeasure: model.dispersionMeasure + DISPERSION_STEP.step };
}

function mishapUs(pulsar: InventedPulsar, receiver: Receiver, reading: Mjd, night: number): number {
  const stepped = receiver.site === CLOCK_STEP.site && mjdNumber(reading) >= CLOCK_STEP.fromMjdUtc;
  const bad =
    pulsar.name === BAD_SESSION.pulsar && receiver.feed === BAD_SESSION.feed && night === BAD_SESSION.nightMjd;
  return (stepped ? CLOCK_STEP.stepUs : 0) + (bad ? BAD_SESSION.shiftUs : 0);
}

/** `60993.2217403361185`, to 1e-13 d (9 ns). */
export function mjdText({ day, fraction }: Mjd): string {
  const digits = fraction.toFixed(13);
  return digits.startsWith('1') ? `${day + 1}.${'0'.repeat(13)}` : `${day}.${digits.slice(2)}`;
}
