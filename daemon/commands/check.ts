import { composeTestMail, type DeliveryOutcome } from '../../alerts/index.ts';
import { mjdOf, systemClock } from '../clock.ts';
import type { Configuration } from '../config/configuration.ts';
import { loadConfiguration } from '../config/loadConfiguration.ts';
import { EXIT, OperatorError, reasonOf } from '../errors.ts';
import { mailerFor } from '../mailerFor.ts';
import { tableWarnings } from '../morning.ts';
import { problemLine } from '../opening.ts';
import { openStore } from '../store/index.ts';
import { loadTables } from '../tables/loadTables.ts';
import { endedTableWarnings } from '../tables/tableEnds.ts';
import { checkFile } from './checkFile.ts';
import { printJson, type Terminal } from './terminal.ts';

export interface CheckOptions {
  readonly config: string;
  readonly sendTestMail?: boolean;
  /** Show how a feed reads this file, and nothing else. */
  readonly file?: string;
  readonly feed?: string;
  readonly json?: boolean;
}

/** `check`: everything that can be known to be wrong before the watch starts. Changes nothing; sends a test mail where asked for. */
export async function check(terminal: Terminal, options: CheckOptions): Promise<void> {
  const { file, feed } = options;
  if (file !== undefined) return checkFile(terminal, { ...options, file });
  if (feed !== undefined) throw new OperatorError('--feed goes with --file FILE', { exitCode: EXIT.wrongUsage });
  const { configuration, problems } = loadConfiguration(options.config);
  const mail = configuration === null ? [] : await tryMail(configuration, options.sendTestMail ?? false);
  const now = systemClock.now();
  const ended = configuration === null ? [] : endedTableWarnings(configuration, mjdOf(now));
  const warnings = [...tableWarnings(loadTables(), now), ...ended];
  const record = configuration === null ? [] : recordProblems(configuration);
  if (options.json)
    printJson(terminal, {
      ok: configuration !== null && mail.every(isWell) && record.length === 0,
      problems,
      warnings,
      record,
      mail,
    });
  else {
    for (const problem of problems) terminal.out(`${problem.severity}: ${problemLine(problem)}`);
    for (const warning of warnings) terminal.out(`warning: ${warning}`);
    for (const { what, state, detail } of mail)
      terminal.out(`mail: ${what}: ${state === 'delivered' ? 'well' : state} (${detail})`);
    for (const problem of record) terminal.out(`record: ${problem}`);
    if (configuration !== null) terminal.out(soundLine(configuration));
  }
  if (configuration === null)
    throw new OperatorError('the configuration cannot be used', { exitCode: EXIT.wrongUsage });
  if (record.length > 0) throw new OperatorError('the record is not sound', { exitCode: EXIT.workFailed });
  if (!mail.every(isWell)) throw new OperatorError('mail cannot be sent', { exitCode: EXIT.workFailed });
}

interface MailTry {
  readonly what: string;
  readonly state: DeliveryOutcome['state'];
  readonly detail: string;
}

const isWell = ({ state }: MailTry): boolean => state === 'delivered';

async function tryMail({ mail, observatory }: Configuration, sendTestMail: boolean): Promise<MailTry[]> {
  const mailer = mailerFor(mail);
  const tries: MailTry[] = [{ what: 'login', ...(await outcomeOf(() => mailer.verify())) }];
  if (!sendTestMail || !tries.every(isWell)) return tries;
  const setting = { observatory, from: mail.from, timezone: mail.timezone, reviewUrl: null, now: systemClock.now() };
  const { mime } = await composeTestMail(mail.to, setting);
  for (const recipient of mail.to) {
    const outcome = await outcomeOf(() => mailer.send({ from: mail.from, recipient, mime }));
    tries.push({ what: `test mail to ${recipient}`, ...outcome });
  }
  return tries;
}

async function outcomeOf(attempt: () => Promise<DeliveryOutcome>): Promise<Omit<MailTry, 'what'>> {
  try {
    const { state, detail } = await attempt();
    return { state, detail };
  } catch (error) {
    return { state: 'later', detail: reasonOf(error) };
  }
}

/** Every invariant of what is on record; before the first start there is none. */
function recordProblems({ stateFolder }: Configuration): readonly string[] {
  const opened = openStore(stateFolder, { mode: 'reader' });
  if (!opened.ok) return opened.failure.kind === 'nothing on record' ? [] : [opened.failure.message];
  try {
    return opened.store.verify();
  } finally {
    opened.store.close();
  }
}

function soundLine({ file, feeds, sites, models }: Configuration): string {
  return `${file} is sound: ${feeds.length} feeds, ${sites.length} sites, ${models.size} pulsars.`;
}
