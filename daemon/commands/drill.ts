import { sizeText } from '../../alerts/index.ts';
import type { TimedArrival } from '../../detectors/arrival.ts';
import type { KnownGlitch, PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { mjdNumber, normalMjd } from '../../detectors/time/mjd.ts';
import { systemClock } from '../clock.ts';
import { mailAddress } from '../config/fields.ts';
import { type Delay, type Drill, drillLog, epochProblem, runDrill } from '../drill.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { parseDecimal } from '../intake/numbers.ts';
import { silentLog } from '../log.ts';
import { createStation } from '../station.ts';
import { loadTables } from '../tables/loadTables.ts';
import { mjdFrom } from './events.ts';
import { requireModel, withRecord } from './record.ts';
import { printJson, type Terminal } from './terminal.ts';

export interface DrillCommandOptions {
  readonly config: string;
  readonly size: string;
  readonly daysAgo?: string;
  readonly at?: string;
  readonly nudot: string;
  readonly recovery?: string;
  readonly mailTo?: readonly string[];
  readonly json?: boolean;
}

/** `drill`: a rehearsal. Fails, with words, when the glitch was not confirmed or the mail did not leave. */
export async function drill(terminal: Terminal, pulsar: string, options: DrillCommandOptions): Promise<void> {
  const size = stepOf(options);
  const { tables } = loadTables();
  await withRecord(options.config, async (store, configuration) => {
    const model = requireModel(pulsar, configuration);
    const recipients = options.mailTo?.map(address) ?? configuration.mail.to;
    const parts = { configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null };
    const station = createStation(parts);
    const log = drillLog(station, model);
    const epochMjd = epochOf(log, options);
    const problem = epochProblem(log, epochMjd);
    if (problem !== null) throw new OperatorError(`${pulsar}: ${problem}`, { exitCode: EXIT.workFailed });
    const done = await runDrill(station, model, { injected: glitchOf(model, size, epochMjd), recipients });
    const limit = store.pulsarReport(pulsar)?.limit?.deltaNuOverNu90 ?? null;
    if (options.json) printJson(terminal, drillJson(done, size, epochMjd, limit));
    else terminal.out(drillText(done, size, epochMjd));
    complain(done, size, limit);
  });
}

interface StepSize {
  readonly deltaNuOverNu: number;
  readonly deltaNuDotOverNuDot: number;
  readonly recovery: { readonly fraction: number; readonly timescaleDays: number } | null;
}

const LARGEST = 1e-3;

function stepOf({ size, nudot, recovery }: DrillCommandOptions): StepSize {
  const deltaNuOverNu = numberOf('--size', size, LARGEST);
  if (deltaNuOverNu === 0) throw wrong('--size 0 is no glitch');
  return {
    deltaNuOverNu,
    deltaNuDotOverNuDot: numberOf('--nudot', nudot, 10),
    recovery: recovery === undefined ? null : recoveryOf(recovery),
  };
}

function recoveryOf(text: string): StepSize['recovery'] {
  const parts = text.split(',');
  if (parts.length !== 2) throw wrong(`--recovery ${text}: write Q and days, such as 0.2,30`);
  const fraction = numberOf('--recovery', parts[0]!, 10);
  const timescaleDays = numberOf('--recovery', parts[1]!, 1e5);
  if (timescaleDays <= 0) throw wrong(`--recovery ${text}: the timescale must be larger than 0 d`);
  return { fraction, timescaleDays };
}

function numberOf(option: string, text: string, largest: number): number {
  const value = parseDecimal(text.trim());
  if (value !== null && Math.abs(value) <= largest) return value;
  throw wrong(`${option} ${text}: must be a number between -${largest} and ${largest}`);
}

function address(text: string): string {
  if (mailAddress.safeParse(text).success) return text;
  throw wrong(`--mail-to ${text}: must be a plain mail address such as duty@example.org`);
}

function wrong(message: string): OperatorError {
  return new OperatorError(message, { exitCode: EXIT.wrongUsage });
}

/** Enough to see a small step grow. */
const ARRIVALS_AFTER = 30;

function epochOf(log: readonly TimedArrival[], { at, daysAgo }: DrillCommandOptions): number {
  if (at !== undefined) return mjdFrom(at);
  const last = log.at(-1);
  if (last === undefined) return 0;
  if (daysAgo !== undefined) {
    const days = numberOf('--days-ago', daysAgo, 1e5);
    if (days <= 0) throw wrong(`--days-ago ${daysAgo}: must be larger than 0`);
    return mjdNumber(last.tdb) - days;
  }
  const after = Math.max(1, log.length - Math.min(ARRIVALS_AFTER, Math.floor(log.length / 2)));
  const [a, b] = [log[after - 1]!, log[after] ?? last];
  return (mjdNumber(a.tdb) + mjdNumber(b.tdb)) / 2;
}

/** Δν is the whole step at the glitch, the part that decays included. */
function glitchOf({ spin }: PulsarModel, size: StepSize, epochMjd: number): KnownGlitch {
  const step = size.deltaNuOverNu * spin.frequencyHz.hi;
  const decaying = (size.recovery?.fraction ?? 0) * step;
  return {
    epochTdb: normalMjd(epochMjd, 0),
    phaseTurns: 0,
    frequencyStepHz: step - decaying,
    frequencyDerivativeStepHzPerS: size.deltaNuDotOverNuDot * spin.frequencyDerivativeHzPerS,
    recoveries:
      size.recovery === null ? [] : [{ frequencyStepHz: decaying, timescaleDays: size.recovery.timescaleDays }],
  };
}

function drillJson(done: Drill, size: StepSize, epochMjd: number, limit: number | null): unknown {
  const { pulsar, event, suspected, confirmed, mail } = done;
  return { pulsar, injected: { epochMjd, ...size }, event, suspected, confirmed, mail, deltaNuOverNu90: limit };
}

function drillText({ pulsar, event, suspected, confirmed, mail }: Drill, size: StepSize, epochMjd: number): string {
  const recovery =
    size.recovery === null ? '' : `, of which ${size.recovery.fraction} decays within ${size.recovery.timescaleDays} d`;
  const nudot = size.deltaNuDotOverNuDot === 0 ? '' : `, Δν̇/ν̇ = ${size.deltaNuDotOverNuDot}`;
  return [
    `DRILL on a copy of the arrivals of ${pulsar}; the log is untouched.`,
    `injected:   Δν/ν = ${size.deltaNuOverNu}${recovery}${nudot} at MJD ${epochMjd.toFixed(3)}`,
    `suspected:  ${delayText(suspected)}`,
    `confirmed:  ${delayText(confirmed)}`,
    ...(event === null
      ? []
      : [
          `found:      ${event.explanation}, ${sizeText(event)}, MJD ${event.epochMjd.toFixed(3)}${within(event, size)}`,
        ]),
    ...mail.map(
      ({ recipient, state, detail }) => `mail to ${recipient}: ${state === 'delivered' ? 'well' : state} (${detail})`,
    ),
  ].join('\n');
}

function delayText(delay: Delay | null): string {
  if (delay === null) return 'never';
  const arrivals = delay.arrivals === 1 ? 'arrival' : 'arrivals';
  return `${delay.days.toFixed(1)} d after it, by ${delay.arrivals} ${arrivals} (MJD ${delay.mjd.toFixed(3)})`;
}

function within({ deltaNuOverNuInterval68: interval }: NonNullable<Drill['event']>, size: StepSize): string {
  if (interval === null) return '';
  const inside = interval[0] <= size.deltaNuOverNu && size.deltaNuOverNu <= interval[1];
  return `; the injected size lies ${inside ? 'within' : 'outside'} the 68 % interval`;
}

function complain({ pulsar, suspected, confirmed, mail }: Drill, size: StepSize, limit: number | null): void {
  if (confirmed === null) {
    const how = suspected === null ? 'neither suspected nor confirmed' : 'suspected, but not confirmed';
    const known =
      limit === null
        ? 'no limit is known for this pulsar'
        : `the smallest glitch confirmed with 90 % probability is Δν/ν = ${limit.toPrecision(2)}`;
    const message = `${pulsar}: a glitch of Δν/ν = ${size.deltaNuOverNu} was ${how} by the arrivals after it; nobody would have been told`;
    throw new OperatorError(message, { exitCode: EXIT.workFailed, advice: known });
  }
  const stuck = mail.filter(({ state }) => state !== 'delivered');
  if (stuck.length > 0) {
    const names = stuck.map(({ recipient, detail }) => `${recipient} (${detail})`).join(', ');
    throw new OperatorError(`the mail did not reach ${names}`, { exitCode: EXIT.workFailed });
  }
}
