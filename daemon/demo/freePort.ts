import { createServer } from 'node:net';
import { EXIT, OperatorError } from '../errors.ts';

const PORTS_TRIED = 50;

/** The first free port on loopback from `first` on. */
export async function freePort(first: number): Promise<number> {
  for (let port = first; port < first + PORTS_TRIED; port++) if (await isFree(port)) return port;
  throw new OperatorError(`the ports ${first} to ${first + PORTS_TRIED - 1} are all taken`, {
    exitCode: EXIT.workFailed,
  });
}

function isFree(port: number): Promise<boolean> {
  return new Promise((resolve) => {
    const server = createServer();
    server.once('error', () => resolve(false));
    server.listen(port, '127.0.0.1', () => server.close(() => resolve(true)));
  });
}
