import type { AliasOption, AliasPlan } from '../../detectors/plan/aliasPlan.ts';
import type { EventPlan, Plan } from '../../detectors/plan/plan.ts';
import type { ExpectedWidths, RecoveryPlan } from '../../detectors/plan/recoveryPlan.ts';
import type { SuspicionPlan } from '../../detectors/plan/suspicionPlan.ts';
import { oneLine } from '../markup.ts';
import { dateOfMjd, mjdText, momentText } from './dates.ts';
import { percent, plain, power, quantity } from './numbers.ts';

/** A plan in words for the person at the telescope: the most urgent first, each with what it buys. */
export function planText(plan: Plan, timezone: string): string {
  const when = whenIn(timezone);
  const { lastArrivalMjd } = plan;
  const last =
    lastArrivalMjd === null ? 'no arrivals yet, nothing to plan from' : `last arrival ${when(lastArrivalMjd)}`;
  const parts = [
    [{ says: `${oneLine(plan.pulsar)}: ${last}`, lines: [] }],
    ...eventParts(plan, when),
    ...(plan.count === null ? [] : [countPart(plan, when)]),
    ...(plan.cadences.length === 0 ? [] : [cadencePart(plan)]),
  ];
  return parts
    .map((part) => part.flatMap(({ says, lines }) => [says, ...lines.map((line) => `  ${line}`)]).join('\n'))
    .join('\n\n');
}

/** What a plan says, and the list under it. */
export interface PlanStatement {
  readonly says: string;
  readonly lines: readonly string[];
}

/** What a plan says of one event, in the same words; empty: nothing. */
export function planOfEvent(plan: EventPlan, event: string, timezone: string): PlanStatement[] {
  const own = <Part extends { readonly event: string }>(part: Part | null) => (part?.event === event ? part : null);
  const { aliases, suspicion, recovery } = plan;
  const when = whenIn(timezone);
  const parts = eventParts({ aliases: own(aliases), suspicion: own(suspicion), recovery: own(recovery) }, when);
  return parts.length === 0 ? [] : [...parts.flat(), ...countPart(plan, when)];
}

type When = (mjd: number) => string;

function whenIn(timezone: string): When {
  return (mjd) => `${momentText(dateOfMjd(mjd), timezone)} (${mjdText(mjd)})`;
}

function eventParts(
  { aliases, suspicion, recovery }: Pick<EventPlan, 'aliases' | 'suspicion' | 'recovery'>,
  when: When,
): PlanStatement[][] {
  return [
    ...(aliases === null ? [] : [aliasPart(aliases, when)]),
    ...(suspicion === null ? [] : [suspicionPart(suspicion, when)]),
    ...(recovery === null ? [] : [recoveryPart(recovery, when)]),
  ];
}

function aliasPart({ event, aliases, probabilityNow, options }: AliasPlan, when: When): PlanStatement[] {
  const sizes = aliases.map((a) => `${hertz(a.deltaNuHz)} (${percent(a.probability)})`).join(', ');
  return [
    { says: `To settle the size of ${oneLine(event)}: still possible are ${sizes}.`, lines: [] },
    {
      says: `The likeliest is right with ${percent(probabilityNow)} today. It would be with:`,
      lines: options.map(
        (option) => `${percent(option.expectedProbability)}  ${timesText(option, when)}${toldApart(option)}`,
      ),
    },
  ];
}

function timesText({ timesMjd, hoursFromUsual }: AliasOption, when: When): string {
  const [first, second] = timesMjd;
  const offset = hoursText(hoursFromUsual[0]!);
  if (second === undefined) return `one arrival ${when(first!)}, ${offset}`;
  return `two arrivals ${plain((second - first!) * 24, 2)} h apart, the first ${when(first!)}, ${offset}`;
}

function hoursText(hours: number): string {
  if (hours === 0) return 'at the usual sidereal time';
  return `${plain(Math.abs(hours), 2)} h ${hours < 0 ? 'before' : 'after'} the usual sidereal time`;
}

const TOLD_APART_SIGMAS = 3;

function toldApart({ separations }: AliasOption): string {
  const apart = separations.filter((s) => s.sigmas >= TOLD_APART_SIGMAS);
  if (apart.length === separations.length) return '; tells all apart from the likeliest';
  if (apart.length === 0) return '; tells none apart for certain';
  return `; tells ${apart.map((s) => hertz(s.deltaNuHz)).join(', ')} apart from the likeliest`;
}

function suspicionPart({ event, logOdds, confirmLogOdds, options }: SuspicionPlan, when: When): PlanStatement[] {
  const says = `To confirm or dismiss ${oneLine(event)}: log odds ${plain(logOdds, 2)} today, ${plain(confirmLogOdds, 2)} confirm.`;
  const lines = [
    ...options.map(({ everyDays, sessions, settledByMjd, chanceAfter }) => {
      const cadence = everyDays === 1 ? 'nightly' : `every ${everyDays} nights`;
      const first = `; after the first session ${percent(chanceAfter[0]!)}`;
      return settledByMjd === null || sessions === null
        ? `${cadence}: not settled with 90 % within ${MANY_SESSIONS} sessions${first}`
        : `${cadence}: ${sessions} ${sessions === 1 ? 'session' : 'sessions'}, settled with 90 % by ${when(settledByMjd)}${first}`;
    }),
    'The noise is weighed again before a confirmation, which may take longer.',
  ];
  return [{ says, lines }];
}

const MANY_SESSIONS = 60;

function recoveryPart(plan: RecoveryPlan, when: When): PlanStatement[] {
  const what = `Q = ${plain(plan.q, 2)}, τ = ${plain(plan.timescaleDays, 2)} d`;
  const basis = plan.assumed ? `no recovery is established; planned for ${what}` : `planned for ${what}`;
  return [
    {
      says: `To pin the recovery of ${oneLine(plan.event)} over the next 30 days (${basis}). Expected 68 % half-widths of Δν, Δν̇, Q, τ:`,
      lines: [
        `today: ${widthsText(plan.now)}`,
        ...plan.schedules.map(({ name, nights, widths }) => `${name}, ${nights} nights: ${widthsText(widths)}`),
      ],
    },
    {
      says: `Fewest nights for nearly the best: ${plan.recommended}. What each of them buys:`,
      lines: plan.nights.map(({ mjd, widths }) => `${when(mjd)}: ${widthsText(widths)}`),
    },
  ];
}

function widthsText({ deltaNuHz, deltaNuDotHzPerS, q, timescaleDays }: ExpectedWidths): string {
  if (deltaNuHz === null || deltaNuDotHzPerS === null || q === null || timescaleDays === null)
    return 'not yet constrained';
  const dot = quantity({
    value: deltaNuDotHzPerS,
    interval68: [deltaNuDotHzPerS, deltaNuDotHzPerS],
    unit: 'Hz/s',
    scale: 'power',
  });
  return `± ${hertz(deltaNuHz)}, ± ${dot}, ± ${plain(q, 2)}, ± ${plain(timescaleDays, 2)} d`;
}

function countPart(plan: EventPlan, when: When): PlanStatement[] {
  return [{ says: countText(plan, when), lines: [] }];
}

function countText({ count, asOfMjd, locked }: EventPlan, when: When): string {
  if (!locked) return 'The pulse count is not settled: observe twice in one night, then nightly, until it is.';
  if (count!.safeUntilMjd === null) return 'The pulse count is safe for ten years without an arrival.';
  const late = count!.safeUntilMjd < asOfMjd ? ' That time has passed: observe twice in one night.' : '';
  return `The next arrival should come before ${when(count!.safeUntilMjd)}: later its pulse cannot be numbered without doubt.${late}`;
}

function cadencePart({ cadences }: Plan): PlanStatement[] {
  const lines = cadences.map(
    ({ everyDays, deltaNuOverNu90, delayDays90, deltaNuOverNu90WithinMonth: soon, reason }) => {
      const cadence = everyDays === 1 ? 'daily' : `every ${everyDays} d`;
      const month = soon === null ? 'none' : `Δν/ν = ${power(soon)}`;
      return deltaNuOverNu90 === null || delayDays90 === null
        ? `${cadence}: ${reason ?? 'none'}`
        : `${cadence}: Δν/ν = ${power(deltaNuOverNu90)}, within ${plain(delayDays90, 2)} d (within a month: ${month})`;
    },
  );
  return [{ says: 'The smallest glitch that is confirmed with 90 % probability, by cadence:', lines }];
}

function hertz(value: number): string {
  return quantity({ value, interval68: [value, value], unit: 'Hz', scale: 'prefix' });
}
