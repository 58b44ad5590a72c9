import { Argument, Command, CommanderError, Option } from 'commander';
import { NOTICE_FORMS, STATES } from './commands/choices.ts';
import type { Terminal } from './commands/terminal.ts';
import { EXIT, type ExitCode, OperatorError } from './errors.ts';
import { programVersion } from './packageRoot.ts';

// The command line: which commands there are, what they take, and what the shell learns from them. What a command needs is loaded when it
// runs, so that help and complaints come at once.

function createProgram(terminal: Terminal): Command {
  const program = new Command('spinvigil')
    .description('Unattended glitch watching for pulsar timing programmes.')
    .version(programVersion())
    .configureOutput({ writeOut: (text) => terminal.out(text), writeErr: (text) => void terminal.err.write(text) })
    .addHelpText(
      'after',
      `\nExit codes: 0 done, 1 the work failed, 2 wrong usage or configuration, 3 another instance holds the state folder.`,
    );
  const add: Add = (name, description) =>
    program.command(name).description(description).option('--config <file>', 'configuration', './spinvigil.toml');
  for (const addSome of [addWork, addEvents, addPulsars, addCopies]) addSome(add, terminal);
  return program;
}

/** Begins a command. */
type Add = (name: string, description: string) => Command;

const event = () => new Argument('<event>', 'its id; one it had before will do');

function addWork(command: Add, terminal: Terminal): void {
  command('watch', 'the daemon: take in what the feeds deliver, decide, alert, serve the review page').action(
    async (options) => (await import('./commands/watch.ts')).watch(terminal, options),
  );
  command('check', 'validate configuration, models, clock tables, folders and the mail login')
    .option('--send-test-mail', 'send a marked test mail to every recipient')
    .option('--file <file>', 'show instead how a feed reads this file: its first rows, and every complaint')
    .option('--feed <name>', "read that file with this feed's layout; else by the folder it lies in")
    .option('--json', 'print as JSON')
    .action(async (options) => (await import('./commands/check.ts')).check(terminal, options));
  command('replay', 'take in an archive offline, in time order, as the watch would have')
    .argument('<file...>', 'arrival files')
    .option('--feed <name>', "read them with this feed's layout; else by the folder they lie in")
    .option('--mail', 'mail what the watch would have mailed')
    .option('--json', 'print the summary as JSON')
    .action(async (files, options) => (await import('./commands/replay.ts')).replay(terminal, files, options));
}

function addEvents(command: Add, terminal: Terminal): void {
  command('events', 'the event log')
    .option('--since <date>', 'with an epoch at or after a date (2026-03-29, UTC) or an MJD')
    .option('--pulsar <name>', 'of this pulsar, site events that it showed among them')
    .addOption(new Option('--state <state>', 'in this state').choices(STATES))
    .option('--json', 'print as JSON')
    .action(async (options) => (await import('./commands/events.ts')).events(terminal, options));
  command('show', 'everything about one event')
    .addArgument(event())
    .option('--json', 'print as JSON')
    .action(async (id, options) => (await import('./commands/show.ts')).show(terminal, id, options));
  command('review', "a person's verdict on an event")
    .addArgument(event())
    .option('--accept', 'it is what the program says')
    .option('--reject', 'it is not')
    .option('--reopen', 'take the verdict back')
    .requiredOption('--by <name>', 'who decides')
    .option('--note <text>', 'why', '')
    .option('--json', 'print the event as JSON')
    .action(async (id, options) => (await import('./commands/review.ts')).review(terminal, id, options));
  command('reviewer', 'set the password with which a reviewer logs in on the review page')
    .argument('<name>', 'one of [review] reviewers')
    .option('--remove', 'take the password away')
    .action(async (name, options) => (await import('./commands/reviewer.ts')).reviewer(terminal, name, options));
  command('morning', 'the morning review')
    .option('--date <date>', 'of an earlier day, such as 2026-03-29')
    .option('--html <file>', 'write it as a page to this file')
    .option('--json', 'print as JSON')
    .action(async (options) => (await import('./commands/morning.ts')).morning(terminal, options));
}

function addPulsars(command: Add, terminal: Terminal): void {
  command('limits', 'the smallest glitch that would have been confirmed, per pulsar, the blindest first')
    .option('--pulsar <name>', 'of this pulsar')
    .option('--json', 'print as JSON')
    .action(async (options) => (await import('./commands/limits.ts')).limits(terminal, options));
  command('plan', 'when to observe a pulsar next, and what that would settle')
    .argument('<pulsar>', 'its name in the models folder')
    .option('--json', 'print as JSON')
    .action(async (pulsar, options) => (await import('./commands/plan.ts')).plan(terminal, pulsar, options));
  command('arrivals', 'every arrival of a pulsar on record: times, delays, deviation, and what was done with it')
    .argument('<pulsar>', 'its name in the models folder')
    .addOption(new Option('--csv', 'print as CSV, safe for spreadsheets').conflicts('json'))
    .option('--json', 'print as JSON')
    .action(async (pulsar, options) => (await import('./commands/arrivals.ts')).arrivals(terminal, pulsar, options));
  command('model', 'the spin-down model of a pulsar to fold with, after its last confirmed event')
    .argument('<pulsar>', 'its name in the models folder')
    .option('--at <date>', 'as it was good at a date (2026-03-29, UTC) or an MJD')
    .option('--to <file>', 'write it there, whole at once: a shell that is sent there empties the file first')
    .option('--json', 'as JSON; else as a file for the models folder')
    .action(async (pulsar, options) => (await import('./commands/model.ts')).model(terminal, pulsar, options));
  command(
    'drill',
    'a rehearsal: a synthetic glitch in a copy of the data, through the whole chain to a mail marked DRILL',
  )
    .argument('<pulsar>', 'its name in the models folder')
    .requiredOption('--size <ratio>', 'Δν/ν, such as 2e-8; negative: a spin-down')
    .option('--days-ago <days>', 'the glitch so long before the last arrival; else thirty arrivals ago')
    .addOption(new Option('--at <date>', 'the glitch at a date (2026-03-29, UTC) or an MJD').conflicts('daysAgo'))
    .option('--nudot <ratio>', 'Δν̇/ν̇', '0')
    .option('--recovery <Q,days>', 'this share of Δν decays within so many days, such as 0.2,30')
    .option('--mail-to <address...>', 'mail it to these; else to those of [mail]')
    .option('--json', 'print as JSON')
    .action(async (pulsar, options) => (await import('./commands/drill.ts')).drill(terminal, pulsar, options));
}

function addCopies(command: Add, terminal: Terminal): void {
  command('export', 'an event as a notice for others')
    .addArgument(event())
    .addOption(new Option('--as <form>', 'the form').choices(NOTICE_FORMS).makeOptionMandatory())
    .action(async (id, options) => (await import('./commands/export.ts')).exportEvent(terminal, id, options));
  command('backup', 'a consistent copy of the record, also while the watch runs')
    .argument('<file>', 'where to; an older copy there is replaced')
    .action(async (file, options) => (await import('./commands/copies.ts')).backup(terminal, file, options));
  command('restore', 'bring a copy back; the watch must not run')
    .argument('<file>', 'a copy made by backup')
    .action(async (file, options) => (await import('./commands/copies.ts')).restore(terminal, file, options));
}

/** Runs one command line and answers with what the shell is to learn. */
export async function runCommandLine(args: readonly string[], terminal: Terminal): Promise<ExitCode> {
  const program = createProgram(terminal);
  for (const command of [program, ...program.commands]) command.exitOverride();
  try {
    await program.parseAsync(args, { from: 'user' });
    return EXIT.done;
  } catch (error) {
    // Commander has printed what it complains of.
    if (error instanceof CommanderError) return error.exitCode === 0 ? EXIT.done : EXIT.wrongUsage;
    const known = isUnfit(error) ? UNFIT : error;
    if (!(known instanceof OperatorError)) throw error;
    const advice = known.advice === null ? '' : `; ${known.advice}`;
    terminal.err.write(`spinvigil: ${known.message}${advice}\n`);
    return known.exitCode;
  }
}

/** A native module that was built for another Node is the installation's fault, not ours. */
function isUnfit(error: unknown): boolean {
  return ((error ?? {}) as NodeJS.ErrnoException).code === 'ERR_DLOPEN_FAILED';
}

const UNFIT = new OperatorError(`the database module does not fit this Node (${process.version})`, {
  exitCode: EXIT.workFailed,
  advice: 'run npm ci again with the Node that runs the watch',
});
