import { request as requestHttp } from 'node:http';
import { request as requestHttps } from 'node:https';

const DEADLINE_MS = 10_000;
const ANYWHERE: Readonly<Record<string, string>> = { '0.0.0.0': '127.0.0.1', '::': '::1' };

/**
 * Whether our own listener still answers. A page that is full of connections and turns us away lives too: nobody outside shall be able to have
 * the watch started again.
 */
export function listenerAnswers(at: {
  readonly host: string;
  readonly port: number;
  readonly tls: boolean;
}): Promise<boolean> {
  const request = at.tls ? requestHttps : requestHttp;
  return new Promise((resolve) => {
    const going = request({
      host: ANYWHERE[at.host] ?? at.host,
      port: at.port,
      method: 'HEAD',
      path: '/assets/mark.svg',
      agent: false,
      // We ask ourselves: whether the certificate is good is for browsers to say.
      rejectUnauthorized: false,
    });
    const end = (answers: boolean) => {
      clearTimeout(deadline);
      resolve(answers);
      going.destroy();
    };
    const deadline = setTimeout(() => end(false), DEADLINE_MS);
    going.on('response', () => end(true));
    going.on('error', (error: NodeJS.ErrnoException) => end(error.code === 'ECONNRESET'));
    going.end();
  });
}
