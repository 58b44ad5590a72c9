import type { PulsarTimes } from '../../detectors/index.ts';
import { dice } from './simulatedPulsar.ts';

/** A pulsar that only keeps time, as the clock of its site shows it. */
export interface QuietPulsar {
  readonly name: string;
  readonly frequencyHz: number;
  readonly uncertaintyUs: number;
  readonly seed: number;
  /** Seconds by which the site's clock is late at a session; `daysIn` counts from the first. */
  readonly lateS: (daysIn: number) => number;
  readonly site?: string;
  /** The first session comes so long after that of others, days. */
  readonly startDays?: number;
}

export const FIRST_MJD = 60_000;

/** Sessions every day or so; the pulsar's own count follows steps of its phase to the nearest turn, as real counts do. */
export function siteSessions(pulsar: QuietPulsar, sessions = 80): PulsarTimes {
  const random = dice(pulsar.seed * 7919);
  for (let i = 0; i < 20; i++) random.uniform();
  const { frequencyHz, uncertaintyUs, startDays = 0 } = pulsar;
  const sigma = uncertaintyUs * 1e-6 * frequencyHz;
  return {
    pulsar: pulsar.name,
    frequencyHz,
    walks: { phaseWalk: 1e-16, frequencyWalk: 1e-18, torqueWalk: 1e-24 },
    places: [`${pulsar.site ?? 'kestrel ridge'}|main`],
    sessions: Array.from({ length: sessions }, (_, i) => {
      const daysIn = startDays + i + 0.2 * random.uniform();
      const turns = pulsar.lateS(daysIn) * frequencyHz;
      return {
        siteMjd: FIRST_MJD + daysIn,
        tDays: daysIn,
        deviationTurns: turns - Math.round(turns) + sigma * random.normal(),
        varianceTurns2: sigma * sigma,
        place: 0,
        freed: false,
      };
    }),
  };
}
