import { systemClock } from '../clock.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { complaintAbout } from '../review/verdictForm.ts';
import { eventOf, withRecord } from './record.ts';
import { printJson, type Terminal } from './terminal.ts';

export interface ReviewOptions {
  readonly config: string;
  readonly accept?: boolean;
  readonly reject?: boolean;
  readonly reopen?: boolean;
  readonly by: string;
  readonly note: string;
  readonly json?: boolean;
}

/** `review`: a verdict from the command line, under the same rules as on the page. */
export async function review(terminal: Terminal, id: string, options: ReviewOptions): Promise<void> {
  const chosen = (['accept', 'reject', 'reopen'] as const).filter((verdict) => options[verdict]);
  const [verdict] = chosen;
  if (verdict === undefined || chosen.length > 1) throw wrongUsage('give one of --accept, --reject, --reopen');
  await withRecord(options.config, (store, configuration) => {
    const { by, note } = options;
    const complaint = complaintAbout({ verdict, by, note }, configuration.review.reviewers);
    if (complaint !== null) throw wrongUsage(complaint);
    const { event } = eventOf(store, id);
    const outcome = store.recordVerdict(event.id, { verdict, by, note, at: systemClock.now().toISOString() });
    if (outcome.kind === 'unknown event') eventOf(store, id);
    else if (outcome.kind === 'conflict') throw new OperatorError(outcome.message, { exitCode: EXIT.workFailed });
    else if (options.json) printJson(terminal, outcome.record.event);
    else
      terminal.out(
        `${outcome.record.event.id} is ${outcome.record.event.state} (revision ${outcome.record.revision}).`,
      );
  });
}

function wrongUsage(message: string): OperatorError {
  return new OperatorError(message, { exitCode: EXIT.wrongUsage });
}
