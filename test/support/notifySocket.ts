import { type ChildProcess, spawn, spawnSync } from 'node:child_process';
import { once } from 'node:events';

/** What systemd listens on (sd_notify(3)), played by a few lines of Python: Node has no datagrams over a unix socket. */
export interface NotifySocket {
  readonly path: string;
  /** The words of each message, in order; what only marks the end of a message is left out. */
  messages(): readonly string[][];
  close(): Promise<void>;
}

const LISTENER = `import socket, sys
s = socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM)
s.bind(sys.argv[1])
print('bound', flush=True)
while True: print(s.recv(4096).decode().replace('\\n', '|'), flush=True)`;

const PYTHON = '/usr/bin/python3';

export function whyNoNotifySocket(): string | null {
  if (spawnSync('systemd-notify', ['--version']).status !== 0) return 'systemd-notify is not installed';
  return spawnSync(PYTHON, ['--version']).status === 0 ? null : 'python3 is not installed';
}

export async function openNotifySocket(path: string): Promise<NotifySocket> {
  const child: ChildProcess = spawn(PYTHON, ['-c', LISTENER, path], { stdio: ['ignore', 'pipe', 'inherit'] });
  let text = '';
  child.stdout?.on('data', (chunk) => (text += chunk));
  while (!text.includes('bound')) await once(child.stdout!, 'data');
  return {
    path,
    messages: () =>
      text
        .split('\n')
        .slice(1, -1)
        .filter((line) => !line.startsWith('BARRIER='))
        .map((line) => line.split('|')),
    async close() {
      child.kill('SIGKILL');
      if (child.exitCode === null && child.signalCode === null) await once(child, 'exit');
    },
  };
}
