import { connect, type Socket } from 'node:net';

/** HTTP by hand over a plain socket: for requests that no well-behaved client sends. */

export interface RawAnswer {
  /** 0: the connection ended without an answer. */
  readonly status: number;
  readonly headers: ReadonlyMap<string, string>;
  readonly body: string;
}

export function portOf(url: string): number {
  return Number(new URL(url).port);
}

/** Sends the bytes and reads until the other side ends the connection. */
export async function sendRaw(url: string, bytes: string | Buffer): Promise<RawAnswer> {
  const socket = connect(portOf(url), '127.0.0.1');
  socket.write(typeof bytes === 'string' ? Buffer.from(bytes, 'latin1') : bytes);
  return parseAnswer(await readToEnd(socket));
}

/** A request with `Connection: close` and the right Host; `headers` replace or add. */
export function sendRequest(
  url: string,
  requestLine: string,
  headers: readonly string[] = [`Host: 127.0.0.1:${portOf(url)}`],
  body = '',
): Promise<RawAnswer> {
  return sendRaw(url, `${[requestLine, ...headers, 'Connection: close', '', ''].join('\r\n')}${body}`);
}

export function readToEnd(socket: Socket): Promise<string> {
  return new Promise((resolve) => {
    const chunks: Buffer[] = [];
    socket.on('data', (chunk) => chunks.push(chunk));
    socket.on('error', () => {}); // a reset is an end too
    socket.on('close', () => resolve(Buffer.concat(chunks).toString('utf8')));
  });
}

export function parseAnswer(text: string): RawAnswer {
  const [head = '', ...rest] = text.split('\r\n\r\n');
  const [statusLine = '', ...lines] = head.split('\r\n');
  const headers = new Map(
    lines.map((line) => {
      const cut = line.indexOf(':');
      return [line.slice(0, cut).toLowerCase(), line.slice(cut + 1).trim()] as const;
    }),
  );
  return { status: Number(statusLine.split(' ')[1] ?? 0), headers, body: rest.join('\r\n\r\n') };
}
