/** The delays of many trials as rows of a table. */
import { AHEAD, CADENCES, type Cell, EXPECTED, HISTORIES, NOISES, type Trial } from './detectionTrial.ts';

export interface Head {
  readonly date: string;
  readonly seed: number;
  readonly perCell: number;
}

/** At the detector's threshold. */
type FalseAlarms = Pick<Cell, 'history' | 'cadence' | 'noise'> & { readonly perYear: number };

export interface Result extends Head {
  readonly histories: readonly {
    readonly history: Cell['history'];
    readonly rows: readonly Row[];
    readonly falseAlarms: readonly FalseAlarms[];
  }[];
}

/** Mean delays in arrivals from the first after the glitch; ratios are those of the means. */
export interface Row {
  readonly what: string;
  readonly cadence: string | null;
  readonly expected: number | null;
  readonly trials: number;
  readonly clairvoyant: number;
  /** Over the clairvoyant delay: of the odds alone, with the share of the explanation, and of the confirmation. */
  readonly odds: number;
  readonly explained: number;
  readonly confirmed: number;
  /** One standard error of the last, from the scatter of the trials. */
  readonly standardError: number;
  readonly medianOfRatios: number;
  /** Not confirmed within the arrivals that followed: counted with as many. */
  readonly missed: number;
  /** Left out: an alarm of either before the glitch. */
  readonly early: number;
}

export function detectionResult(head: Head, trials: readonly Trial[], falseAlarms: readonly FalseAlarms[]): Result {
  const histories = HISTORIES.map((history) => ({
    history,
    rows: rowsOf(trials.filter((t) => t.history === history)),
    falseAlarms: falseAlarms.filter((f) => f.history === history),
  }));
  return { ...head, histories };
}

function rowsOf(trials: readonly Trial[]): Row[] {
  const row = (what: string, cadence: string | null, expected: number | null, of: (t: Trial) => boolean) =>
    rowOf({ what, cadence, expected }, trials.filter(of));
  return [
    ...CADENCES.map((c) => row(c, c, null, (t) => t.cadence === c)),
    ...CADENCES.flatMap((c) =>
      EXPECTED.map((e) => row(`${c}, about ${e}`, c, e, (t) => t.cadence === c && t.expected === e)),
    ),
    ...NOISES.map((n) => row(n, null, null, (t) => t.noise === n)),
    row('all', null, null, () => true),
  ];
}

function rowOf(name: Pick<Row, 'what' | 'cadence' | 'expected'>, all: readonly Trial[]): Row {
  const trials = all.filter((t) => !t.early);
  const mean = (of: (t: Trial) => number) => trials.reduce((sum, t) => sum + of(t), 0) / trials.length;
  const delay = (arrivals: number | null) => arrivals ?? AHEAD;
  const clairvoyant = mean((t) => delay(t.clairvoyant));
  const ratio = (of: (t: Trial) => number | null) => mean((t) => delay(of(t))) / clairvoyant;
  const confirmed = ratio((t) => t.confirmed);
  const scatter = mean((t) => (delay(t.confirmed) - confirmed * delay(t.clairvoyant)) ** 2);
  const ratios = trials.map((t) => delay(t.confirmed) / delay(t.clairvoyant)).sort((a, b) => a - b);
  return {
    ...name,
    trials: trials.length,
    clairvoyant,
    odds: ratio((t) => t.oddsPassed),
    explained: ratio((t) => t.explained),
    confirmed,
    standardError: Math.sqrt(scatter / trials.length) / clairvoyant,
    medianOfRatios: ratios[ratios.length >> 1] ?? Number.NaN,
    missed: trials.filter((t) => t.confirmed === null).length,
    early: all.length - trials.length,
  };
}

export function detectionMarkdown({ date, seed, perCell, histories }: Result): string {
  return `# Delay of confirmation over the smallest possible

${date}, seed ${seed}, ${perCell} trials per history, cadence, noise and size. The noise is learned from the arrivals before the glitch; the
clairvoyant test (Page 1954) is told size, sign and noise. Delays count arrivals from the first after the glitch. A glitch that is not
confirmed within ${AHEAD} arrivals counts with ${AHEAD}. Ratios are of means; "odds" and "explained": when the odds alone, and the share of the
explanation as well, had passed. False alarms: at the detector's threshold, a year and pulsar, on simulated pulsars of the noise that it
has learned (detectors/nulls); the threshold of the clairvoyant test was set to the same, by importance sampling.

${histories.map(section).join('\n')}`;
}

function section({ history, rows, falseAlarms }: Result['histories'][number]): string {
  const cells = rows.map((r) => [
    r.what,
    r.trials,
    r.clairvoyant.toFixed(1),
    r.odds.toFixed(2),
    r.explained.toFixed(2),
    `${r.confirmed.toFixed(2)} ± ${r.standardError.toFixed(2)}`,
    r.medianOfRatios.toFixed(2),
    r.missed,
    r.early,
  ]);
  const rates = falseAlarms.map((f) => [f.cadence, f.noise, f.perYear.toExponential(1)]);
  const names = ['', 'trials', 'clairvoyant', 'odds', 'explained', 'confirmed', 'median ratio', 'missed', 'early'];
  return `## About ${history} arrivals before the glitch

${table(names, cells)}

${table(['cadence', 'noise', 'false alarms a year and pulsar'], rates)}
`;
}

function table(names: readonly string[], rows: readonly (readonly (string | number)[])[]): string {
  const line = (cells: readonly (string | number)[]) => `| ${cells.join(' | ')} |`;
  return [line(names), line(names.map(() => '---')), ...rows.map(line)].join('\n');
}
