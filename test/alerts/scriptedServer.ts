import type { AddressInfo } from 'node:net';
import { createServer, type Socket } from 'node:net';

/** A mail server that says what the test tells it to at each step; the steps in the order of a session. */
export type Step = 'greeting' | 'EHLO' | 'MAIL' | 'RCPT' | 'DATA' | 'dot';

/** A reply line, or what the server does instead of replying. */
export type Reply = string | 'drop' | 'hang';

export interface ScriptedServer {
  readonly port: number;
  /** Every line the client sent outside the message. */
  readonly commands: string[];
  /** Messages that reached the final dot, dots unstuffed, as they came. */
  readonly bodies: string[];
  close(): Promise<void>;
}

const GOOD: Readonly<Record<Step, Reply>> = {
  greeting: '220 kestrel-ridge.example',
  EHLO: '250 kestrel-ridge.example',
  MAIL: '250 ok',
  RCPT: '250 ok',
  DATA: '354 go on',
  dot: '250 taken',
};

/** Listens on 127.0.0.1 until closed. */
export async function scriptedServer(script: Partial<Record<Step, Reply>>): Promise<ScriptedServer> {
  const sockets = new Set<Socket>();
  const commands: string[] = [];
  const bodies: string[] = [];
  const answer = (socket: Socket, step: Step) => {
    const reply = script[step] ?? GOOD[step];
    if (reply === 'drop') socket.destroy();
    else if (reply !== 'hang') socket.write(`${reply}\r\n`);
  };
  const server = createServer((socket) => {
    sockets.add(socket);
    socket.on('error', () => undefined);
    socket.on('close', () => sockets.delete(socket));
    let buffer = '';
    let inMessage = false;
    socket.on('data', (chunk) => {
      buffer += chunk.toString('latin1');
      for (;;) {
        const ending = inMessage ? '\r\n.\r\n' : '\r\n';
        const end = buffer.indexOf(ending);
        if (end < 0) return;
        const taken = buffer.slice(0, end);
        buffer = buffer.slice(end + ending.length);
        if (inMessage) {
          inMessage = false;
          bodies.push(`${taken}\r\n`.replace(/^\.\./gm, '.'));
          answer(socket, 'dot');
          continue;
        }
        commands.push(taken);
        const verb = taken.slice(0, 4).toUpperCase();
        if (verb === 'QUIT') {
          socket.end('221 bye\r\n');
          continue;
        }
        const step = verb as Step;
        answer(socket, step);
        inMessage = step === 'DATA' && String(script.DATA ?? GOOD.DATA).startsWith('3');
      }
    });
    answer(socket, 'greeting');
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    port: (server.address() as AddressInfo).port,
    commands,
    bodies,
    close: () =>
      new Promise((resolve) => {
        for (const socket of sockets) socket.destroy();
        server.close(() => resolve());
      }),
  };
}
