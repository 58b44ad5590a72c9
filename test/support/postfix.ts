import { execFileSync } from 'node:child_process';
import {
  chownSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  writeFileSync,
} from 'node:fs';
import { connect, createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';

/** A mail server as a Debian machine has it, on a port of its own on loopback, with its settings, queue and mailbox in a temporary folder. */
export interface Postfix {
  readonly port: number;
  readonly version: string;
  /** The mails in the mailbox, in the order in which they came. */
  mailbox(): Buffer[];
  stop(): Promise<void>;
}

const DOMAIN = 'kestrel-ridge.example';
const POSTFIX = '/usr/sbin/postfix';
/** The mailbox belongs to nobody in particular. */
const MAILBOX_USER = 65_534;
const LONGEST_START_MS = 60_000;

/** Why it cannot run here; null: it can. */
export function postfixMissing(): string | null {
  if (!existsSync(POSTFIX)) return 'Debian’s postfix is not installed (apt-get install postfix)';
  return process.getuid?.() === 0 ? null : 'postfix starts only for root';
}

export async function startPostfix(): Promise<Postfix> {
  const folder = mkdtempSync(join(tmpdir(), 'spinvigil-postfix-'));
  const at = (name: string) => join(folder, name);
  execFileSync('chmod', ['755', folder]);
  const port = await freePort();
  for (const name of ['config', 'queue', 'data', 'mail', 'mail/box']) mkdirSync(at(name));
  for (const name of ['mail', 'mail/box']) chownSync(at(name), MAILBOX_USER, MAILBOX_USER);
  execFileSync('chown', ['postfix', at('data')]);
  writeFileSync(at('config/main.cf'), settings(folder));
  writeFileSync(at('config/master.cf'), services(port));
  // Children of the server must not keep our pipes open.
  const postfix = (command: string) => execFileSync(POSTFIX, ['-c', at('config'), command], { stdio: 'ignore' });
  postfix('start');
  const stop = async () => {
    postfix('stop');
    rmSync(folder, { recursive: true, force: true });
  };
  const version = execFileSync('/usr/sbin/postconf', ['-h', 'mail_version'], { encoding: 'utf8' }).trim();
  if (!(await answersWithin(LONGEST_START_MS, port))) {
    const said = readFileSync(at('data/maillog'), 'utf8');
    await stop();
    throw new Error(`postfix did not answer within a minute: ${said}`);
  }
  return {
    port,
    version,
    mailbox() {
      const arrived = at('mail/box/new');
      return existsSync(arrived)
        ? readdirSync(arrived)
            .sort()
            .map((name) => readFileSync(join(arrived, name)))
        : [];
    },
    stop,
  };
}

function settings(folder: string): string {
  return `compatibility_level = 3.6
queue_directory = ${folder}/queue
data_directory = ${folder}/data
command_directory = /usr/sbin
daemon_directory = /usr/lib/postfix/sbin
mail_owner = postfix
setgid_group = postdrop
myhostname = mail.${DOMAIN}
mydestination =
local_recipient_maps =
alias_maps =
inet_interfaces = 127.0.0.1
inet_protocols = ipv4
mynetworks = 127.0.0.0/8
default_transport = error:nothing leaves this machine
virtual_mailbox_domains = ${DOMAIN}
virtual_mailbox_base = ${folder}/mail
virtual_mailbox_maps = static:box/
virtual_uid_maps = static:${MAILBOX_USER}
virtual_gid_maps = static:${MAILBOX_USER}
maillog_file = ${folder}/data/maillog
maillog_file_prefixes = ${folder}
biff = no
`;
}

function services(port: number): string {
  const local = ['pickup unix n - n 60 1 pickup', 'cleanup unix n - n - 0 cleanup', 'qmgr unix n - n 300 1 qmgr'];
  const helpers = [
    'rewrite',
    'trivial-rewrite',
    'bounce',
    'defer',
    'trace',
    'error',
    'virtual',
    'anvil',
    'postlog',
    'proxymap',
  ];
  const program: Record<string, string> = {
    rewrite: 'trivial-rewrite',
    defer: 'bounce',
    trace: 'bounce',
    postlog: 'postlogd',
  };
  const type: Record<string, string> = { postlog: 'unix-dgram n - n - 1' };
  return [
    `127.0.0.1:${port} inet n - n - - smtpd`,
    ...local,
    ...helpers
      .filter((name) => name !== 'trivial-rewrite')
      .map(
        (name) =>
          `${name} ${type[name] ?? `unix - ${name === 'virtual' ? 'n n' : '- n'} - -`} ${program[name] ?? name}`,
      ),
    '',
  ].join('\n');
}

function freePort(): Promise<number> {
  return new Promise((resolve, reject) => {
    const server = createServer();
    server.on('error', reject);
    server.listen(0, '127.0.0.1', () => {
      const { port } = server.address() as { port: number };
      server.close(() => resolve(port));
    });
  });
}

async function answersWithin(longestMs: number, port: number): Promise<boolean> {
  for (const until = Date.now() + longestMs; Date.now() < until; await pause(200)) {
    if (await greets(port)) return true;
  }
  return false;
}

function greets(port: number): Promise<boolean> {
  return new Promise((resolve) => {
    const socket = connect(port, '127.0.0.1');
    const end = (answer: boolean) => {
      resolve(answer);
      socket.destroy();
    };
    socket.once('data', () => end(true)).once('error', () => end(false));
    socket.setTimeout(5000, () => end(false));
  });
}
