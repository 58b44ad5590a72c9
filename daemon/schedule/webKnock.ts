import { request as requestHttp } from 'node:http';
import { request as requestHttps } from 'node:https';

/**
 * One GET that carries nothing: no data, no cookie, no name of ours. Redirects are not followed, and of the answer only the status is looked
 * at, so that whoever owns the address learns only that we live, and can make us do nothing.
 */
export type Knock = { readonly heard: true } | { readonly heard: false; readonly why: string };

const LARGEST_HEAD_BYTES = 8 * 1024;

export function knock(url: string, deadlineMs: number): Promise<Knock> {
  const { protocol, hostname } = new URL(url);
  const request = protocol === 'https:' ? requestHttps : requestHttp;
  return new Promise((resolve) => {
    const options = {
      method: 'GET',
      agent: false,
      maxHeaderSize: LARGEST_HEAD_BYTES,
      headers: { Accept: '*/*' },
    } as const;
    const going = request(url, options);
    const end = (knock: Knock) => {
      clearTimeout(deadline);
      resolve(knock);
      going.destroy();
    };
    const missed = (why: string) => end({ heard: false, why: `${hostname} ${why}` });
    const deadline = setTimeout(() => missed(`did not answer within ${deadlineMs / 1000} s`), deadlineMs);
    going.on('response', ({ statusCode = 0 }) =>
      statusCode >= 200 && statusCode < 300 ? end({ heard: true }) : missed(`answered with status ${statusCode}`),
    );
    going.on('error', (error: NodeJS.ErrnoException) => missed(`cannot be reached (${error.code ?? 'no answer'})`));
    going.end();
  });
}
