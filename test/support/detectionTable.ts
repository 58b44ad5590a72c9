/** The delays of many trials as rows of a table. */
import { AHEAD, CADENCES, EXPECTED, NOISES, type Trial } from './detectionTrial.ts';

export interface Head {
  readonly date: string;
  readonly seed: number;
  readonly perCell: number;
  readonly falseAlarmsPerYear: readonly {
    readonly cadence: string;
    readonly noise: string;
    readonly perYear: number;
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

export function detectionRows(trials: readonly Trial[]): Row[] {
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

export function detectionMarkdown({ date, seed, perCell, falseAlarmsPerYear }: Head, rows: readonly Row[]): string {
  const cells = rows.map((r) =>
    [
      r.what,
      r.trials,
      r.clairvoyant.toFixed(1),
      r.odds.toFixed(2),
      r.explained.toFixed(2),
      `${r.confirmed.toFixed(2)} ± ${r.standardError.toFixed(2)}`,
      r.medianOfRatios.toFixed(2),
      r.missed,
      r.early,
    ].join(' | '),
  );
  const rates = falseAlarmsPerYear.map((r) => `| ${r.cadence} | ${r.noise} | ${r.perYear.toExponential(1)} |`);
  return `# Delay of confirmation over the smallest possible

${date}, seed ${seed}, ${perCell} trials per cadence, noise and size. The noise is learned from 80 to 150 arrivals before the glitch; the
clairvoyant test (Page 1954) is told size, sign and noise. Delays count arrivals from the first after the glitch. A glitch that is not
confirmed within ${AHEAD} arrivals counts with ${AHEAD}. Ratios are of means; "odds" and "explained": when the odds alone, and the share of the
explanation as well, had passed.

| | trials | clairvoyant | odds | explained | confirmed | median ratio | missed | early |
|---|---|---|---|---|---|---|---|---|
${cells.map((line) => `| ${line} |`).join('\n')}

False alarms a year at the detector's threshold, on simulated pulsars of the noise that it has learned (detectors/nulls); the threshold of
the clairvoyant test was set to the same, by importance sampling.

| cadence | noise | a year and pulsar |
|---|---|---|
${rates.join('\n')}
`;
}
