import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

/**
 * A made-up pulsar that spins down smoothly, with steps where a test wants them, seen at the barycentre: its arrivals need no sky.
 * Everything is a function of the description and the seed.
 */
export interface SyntheticPulsar {
  readonly name: string;
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
  readonly epochMjd: number;
  readonly uncertaintyUs: number;
  readonly glitches: readonly { readonly mjd: number; readonly deltaNuOverNu: number }[];
  readonly orbit?: CircularOrbit;
}

/** Told here in its own words, x sin(2π t/P) from the ascending node at the pulsar's epoch, so that it can be held against the program's. */
export interface CircularOrbit {
  readonly periodDays: number;
  readonly semiMajorAxisLightS: number;
}

export interface SyntheticArrival {
  readonly pulsar: string;
  /** Seconds TDB after the pulsar's epoch, when it left the pulsar. */
  readonly seconds: number;
  readonly mjdText: string;
  readonly uncertaintyUs: number;
}

const SECONDS_PER_DAY = 86_400;

export function syntheticPulsar(
  given: Partial<SyntheticPulsar> & Pick<SyntheticPulsar, 'name' | 'epochMjd'>,
): SyntheticPulsar {
  return {
    frequencyHz: 3.1234567,
    frequencyDerivativeHzPerS: -2.5e-14,
    uncertaintyUs: 50,
    glitches: [],
    ...given,
  };
}

/** One arrival about every `everyDays`, at uneven times of day, with Gaussian noise of the stated uncertainty. */
export function syntheticArrivals(
  pulsar: SyntheticPulsar,
  span: { readonly fromMjd: number; readonly toMjd: number; readonly everyDays: number; readonly seed: number },
): readonly SyntheticArrival[] {
  const random = xoroshiro128plus(span.seed);
  const uniform = () => uniformFloat64(random);
  const gaussian = () => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform());
  const arrivals: SyntheticArrival[] = [];
  for (let mjd = span.fromMjd; mjd <= span.toMjd; mjd += span.everyDays) {
    const about = (mjd + 0.4 * span.everyDays * uniform() - pulsar.epochMjd) * SECONDS_PER_DAY;
    const seconds = wholeTurnNear(pulsar, about) + gaussian() * pulsar.uncertaintyUs * 1e-6;
    arrivals.push({
      pulsar: pulsar.name,
      seconds,
      mjdText: mjdText(pulsar.epochMjd, seconds + orbitDelayS(pulsar, seconds)),
      uncertaintyUs: pulsar.uncertaintyUs,
    });
  }
  return arrivals;
}

export function orbitDelayS({ orbit }: SyntheticPulsar, seconds: number): number {
  if (orbit === undefined) return 0;
  return orbit.semiMajorAxisLightS * Math.sin((2 * Math.PI * seconds) / (orbit.periodDays * SECONDS_PER_DAY));
}

/** The rotation phase in turns, with every glitch a pure step in frequency. */
function phaseTurns(pulsar: SyntheticPulsar, seconds: number): number {
  const smooth = pulsar.frequencyHz * seconds + 0.5 * pulsar.frequencyDerivativeHzPerS * seconds ** 2;
  return pulsar.glitches.reduce((phase, glitch) => {
    const since = seconds - (glitch.mjd - pulsar.epochMjd) * SECONDS_PER_DAY;
    return since > 0 ? phase + glitch.deltaNuOverNu * pulsar.frequencyHz * since : phase;
  }, smooth);
}

function wholeTurnNear(pulsar: SyntheticPulsar, about: number): number {
  const turn = Math.round(phaseTurns(pulsar, about));
  let seconds = about;
  for (let i = 0; i < 5; i++) seconds -= (phaseTurns(pulsar, seconds) - turn) / pulsar.frequencyHz;
  return seconds;
}

function mjdText(epochMjd: number, seconds: number): string {
  const day = Math.floor(seconds / SECONDS_PER_DAY);
  const fraction = (seconds - day * SECONDS_PER_DAY) / SECONDS_PER_DAY;
  return `${epochMjd + day}.${fraction.toFixed(15).slice(2)}`;
}

/** The rows as an arrival file of layout `csv`. */
export function arrivalFile(arrivals: readonly SyntheticArrival[]): string {
  const rows = arrivals.map((a) => `${a.pulsar},${a.mjdText},${a.uncertaintyUs.toFixed(3)},inf,barycentre`);
  return ['pulsar,mjd_tdb,uncertainty_us,frequency_mhz,site', ...rows, ''].join('\n');
}

/** The pulsar's start model as a TOML file of the models folder: the truth without its glitches. */
export function modelFile(pulsar: SyntheticPulsar): string {
  return `name = "${pulsar.name}"
right_ascension = "04:17:32.114"
declination = "+31:05:09.80"
position_epoch_mjd = 59000
dispersion_measure = 41.27
[spin]
time_scale = "TDB"
epoch_mjd = "${pulsar.epochMjd}"
frequency_hz = "${pulsar.frequencyHz}"
frequency_derivative = "${pulsar.frequencyDerivativeHzPerS}"
frequency_second_derivative = "0"
${orbitTable(pulsar)}`;
}

function orbitTable({ orbit, epochMjd }: SyntheticPulsar): string {
  if (orbit === undefined) return '';
  return `[orbit]
form = "small eccentricity"
period_days = ${orbit.periodDays}
projected_semi_major_axis_s = ${orbit.semiMajorAxisLightS}
ascending_node_epoch_mjd = "${epochMjd}"
eccentricity_sine = 0
eccentricity_cosine = 0
`;
}
