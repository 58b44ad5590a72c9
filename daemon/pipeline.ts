import { mjdOf } from './clock.ts';
import type { Stage } from './progress.ts';
import { bringToBarycentre, retime } from './stages/arrival.ts';
import { type Consequences, consequencesOf, NO_CONSEQUENCES } from './stages/consequences.ts';
import {
  type FileIdentity,
  type FileInHand,
  type Intake,
  identityOf,
  isOnRecord,
  SET_ASIDE,
  takeRows,
} from './stages/intake.ts';
import { writeCurrentModels } from './stages/modelFiles.ts';
import { noteDecided, noteOpen, openDecisions } from './stages/openDecisions.ts';
import { SiteWatches } from './stages/sites.ts';
import type { Station } from './station.ts';
import { step } from './store/crashStep.ts';
import { emptyBatch, type IntakeBatch, type NewArrival, storageTrouble } from './store/index.ts';

/**
 * The way of the data, as DEVELOPERS.md draws it. A file comes in at one end; what a person is shown comes out at the other. Everything
 * that a file changes is written in one transaction, at the end: a crash before it leaves nothing, a crash after it loses nothing.
 *
 *     file       a watcher or `replay` hands over a file that stands still
 *     intake     its rows, against those on record                          stages/intake
 *     arrival    new rows at the barycentre                                 stages/arrival
 *     deviation  the detector follows each pulsar through its log           stages/sites, stages/deviation
 *     decision   a step of a site's clock is one event, of the site         stages/decision
 *     event      what that means for the events on record                   stages/eventChanges
 *     alert      whom to tell, and the mail                                 stages/alert
 *     review     all of it on record, for the page and for people           store
 */
export const STAGES = ['file', 'intake', 'arrival', 'deviation', 'decision', 'event', 'alert', 'review'] as const;

export interface TakenIn {
  /** `cut short`: the last row may still be growing; nothing was taken in. */
  readonly kind: 'taken in' | 'known' | 'quarantined whole' | 'cut short';
  readonly rows: number;
  readonly newArrivals: number;
  readonly quarantined: number;
  /** Pulsars whose live arrivals changed. */
  readonly pulsars: readonly string[];
  /** Those of them that wait for `decideOpen`. */
  readonly open: readonly string[];
  /** It may hold what somebody must hear of soon. */
  readonly isFresh: boolean;
  readonly events: number;
  readonly mails: number;
}

export interface TakeInOptions {
  /** `later`: `decideOpen` will be called, once for many files. `now if fresh`: later only for what would wake nobody any more. */
  readonly decide: 'now' | 'later' | 'now if fresh';
  readonly mail: boolean;
  /** Take the last row even without a line end. */
  readonly acceptUnterminated: boolean;
}

export interface DecideOptions {
  readonly mail: boolean;
  readonly onPulsar?: (done: number) => void;
}

const NOTHING: Omit<TakenIn, 'kind'> = {
  rows: 0,
  newArrivals: 0,
  quarantined: 0,
  pulsars: [],
  open: [],
  isFresh: false,
  events: 0,
  mails: 0,
};
/** A file whose reading was begun so often and never ended takes the program down each time. */
const MOST_READINGS = 3;
/** The checksum of no file: what begins with it is counted anew for every other. */
const NO_FILE = '';
/** A verdict may come in while events are decided about: then they are decided about again. */
const MOST_ROUNDS = 5;

class Stopped extends Error {
  constructor() {
    super('the program is stopping; this is taken up at the next start');
  }
}

/** Takes one file after the other: calls wait for those before them. */
export class Pipeline {
  readonly #station: Station;
  readonly #watches = new SiteWatches();
  readonly #stage: Stage | null;
  #last: Promise<unknown> = Promise.resolve();
  #stopping = false;
  /** Paths whose reading storage trouble cut off, with its beginning noted. */
  readonly #interrupted = new Set<string>();

  /** @param stage told of every step, and when nothing is in hand */
  constructor(station: Station, stage: Stage | null = null) {
    this.#station = station;
    this.#stage = stage;
  }

  takeIn(file: FileInHand, options: TakeInOptions): Promise<TakenIn> {
    return this.#inTurn(() => this.#takeIn(file, options));
  }

  /** Times and decides again: pulsars whose model, tables or settings may have changed. */
  decide(pulsars: readonly string[], options: DecideOptions): Promise<void> {
    return this.#inTurn(async () => {
      this.#watches.forget(pulsars);
      await this.#retime(pulsars);
      await this.#decideAndRecord(this.#batch(), pulsars, options);
      noteDecided(this.#station.store, pulsars);
    });
  }

  /** Pulsar by pulsar: a large record does not fit into memory. Decisions on record still rest on the old times, and say so by their basis. */
  async #retime(pulsars: readonly string[]): Promise<void> {
    const { store } = this.#station;
    for (const pulsar of pulsars) {
      await this.#pause();
      const retimed = retime(this.#station, store.arrivals(pulsar));
      if (retimed.length > 0) store.commitIntake({ ...this.#batch(), retimed });
    }
  }

  /** Decides about pulsars whose arrivals this pipeline took in with `later`. Answers how many mails that queued. */
  decideOpen(pulsars: readonly string[]): Promise<number> {
    return this.#inTurn(async () => {
      const { messages } = await this.#decideAndRecord(this.#batch(), pulsars, { mail: true });
      noteDecided(this.#station.store, pulsars);
      return messages.length;
    });
  }

  /** Pulsars on record whose decisions rest on another model, other tables or settings than those of now, or were left open. */
  undecided(): readonly string[] {
    const { store, configuration } = this.#station;
    const open = new Set(openDecisions(store));
    const basis = new Map(store.pulsarReports().map((report) => [report.pulsar, report.basis]));
    return store.pulsars().filter((pulsar) => {
      const model = configuration.models.get(pulsar);
      return model !== undefined && (open.has(pulsar) || basis.get(pulsar) !== this.#station.basisOf(model));
    });
  }

  /** Leaves what is in hand at the next pulsar, with nothing of it on record, and refuses what comes. */
  stop(): void {
    this.#stopping = true;
  }

  #inTurn<Result>(work: () => Promise<Result>): Promise<Result> {
    const mine = this.#last.then(async () => {
      if (this.#stopping) throw new Stopped();
      this.#stage?.step();
      try {
        return await work();
      } finally {
        this.#stage?.rest();
      }
    });
    this.#last = mine.catch(() => {});
    return mine;
  }

  async #takeIn(inHand: FileInHand, options: TakeInOptions): Promise<TakenIn> {
    const { store } = this.#station;
    if (isOnRecord(this.#station, inHand)) return { kind: 'known', ...NOTHING };
    step('file in hand');
    const path = { bytesHex: inHand.pathBytes.toString('hex') };
    const file = identityOf(this.#station, inHand);
    const noted = this.#interrupted.delete(file.path);
    // Before anything is made of its bytes: they may be too much for the program.
    const readings = noted ? 1 : store.noteReadingStarts(file.feed, path, file.sha256);
    if (readings > MOST_READINGS) return this.#setAside(file, readings - 1);
    try {
      const intake = takeRows(this.#station, inHand);
      if (!intake.unterminated || options.acceptUnterminated) return await this.#takeInRead(intake, options);
      store.noteReadingStarts(file.feed, path, NO_FILE);
      return { kind: 'cut short', ...NOTHING };
    } catch (error) {
      // Neither a stop nor a full disk is the file's fault: its beginning is not held against it.
      if (error instanceof Stopped) store.noteReadingStarts(file.feed, path, NO_FILE);
      else if (storageTrouble(error) !== null) this.#interrupted.add(file.path);
      throw error;
    }
  }

  async #takeInRead(intake: Intake, options: TakeInOptions): Promise<TakenIn> {
    const batch = this.#timed(intake);
    const { models } = this.#station.configuration;
    const pulsars = intake.reconciliation.pulsarsToDecide.filter((pulsar) => models.has(pulsar));
    const isFresh = this.#isFresh(batch);
    const now = options.decide === 'now' || (options.decide === 'now if fresh' && isFresh);
    const [decided, open] = now ? [pulsars, []] : [[], pulsars];
    noteOpen(this.#station.store, open);
    const { events, messages } = await this.#decideAndRecord(batch, decided, options);
    const result: TakenIn = {
      kind: intake.file.fault === null ? 'taken in' : 'quarantined whole',
      rows: intake.file.rows,
      newArrivals: batch.arrivals.length,
      quarantined: batch.quarantined.length,
      pulsars,
      open,
      isFresh,
      events: events.length,
      mails: messages.length,
    };
    this.#say(intake, result);
    return result;
  }

  /** A new arrival may still wake somebody, or old ones were corrected or taken back. */
  #isFresh({ arrivals, statusChanges }: IntakeBatch): boolean {
    const { configuration, clock } = this.#station;
    const since = mjdOf(clock.now()) - configuration.mail.historicalAfterDays;
    return statusChanges.length > 0 || arrivals.some(({ received: { time } }) => time.day + time.fraction >= since);
  }

  #timed({ file, reconciliation, quarantined }: Intake): IntakeBatch {
    const arrivals = reconciliation.added.map(({ key, row, revises }): NewArrival => {
      const { line, ...received } = row;
      return { key, line, received, revises, ...bringToBarycentre(this.#station, received) };
    });
    const { same: sightings, statusChanges } = reconciliation;
    return { ...this.#batch(), file, arrivals, sightings, statusChanges, quarantined };
  }

  /** The stages from deviation on, and all of it on record. */
  async #decideAndRecord(
    batch: IntakeBatch,
    pulsars: readonly string[],
    options: DecideOptions,
  ): Promise<Consequences> {
    try {
      const { onPulsar = () => {} } = options;
      const pause = () => this.#pause();
      const decided = await this.#watches.follow(this.#station, pulsars, batch, { pause, onPulsar });
      for (let round = 1; round <= MOST_ROUNDS; round++) {
        const consequences =
          decided.rows.length === 0 ? NO_CONSEQUENCES : await consequencesOf(this.#station, decided, options);
        step('decided');
        const outcome = this.#station.store.commitIntake({ ...batch, ...consequences });
        if (outcome.kind === 'committed') {
          await writeCurrentModels(this.#station, decided);
          return consequences;
        }
        this.#station.log.info({ event: outcome.eventId }, 'an event changed meanwhile: deciding again');
      }
      throw new Error('the events on record kept changing while they were decided about');
    } catch (error) {
      this.#watches.forget(pulsars);
      throw error;
    }
  }

  /** Between two pulsars the page, the mail and a signal to stop get their turn. */
  async #pause(): Promise<void> {
    if (this.#stopping) throw new Stopped();
    this.#stage?.step();
    await new Promise((resolve) => setImmediate(resolve));
  }

  #setAside(file: FileIdentity, readings: number): TakenIn {
    const fault = `${SET_ASIDE}: its reading was begun ${readings} times and never finished; see the log, then touch the file to try again`;
    this.#station.store.commitIntake({
      ...this.#batch(),
      file: { ...file, rows: 0, fault },
      quarantined: [{ line: null, reason: fault }],
    });
    this.#station.log.error({ feed: file.feed, file: file.path, reason: fault }, 'quarantined whole');
    return { kind: 'quarantined whole', ...NOTHING, quarantined: 1 };
  }

  #batch(): IntakeBatch {
    return emptyBatch(this.#station.clock.now().toISOString());
  }

  #say({ file, quarantined }: Intake, { pulsars, open, isFresh: _, ...result }: TakenIn): void {
    const facts = { feed: file.feed, file: file.path, ...result, pulsars: pulsars.length, undecided: open.length };
    if (quarantined.length === 0) this.#station.log.info(facts, 'file taken in');
    else
      this.#station.log.warn(
        { ...facts, firstReason: quarantined[0]?.reason },
        'file taken in, some of it quarantined',
      );
  }
}
