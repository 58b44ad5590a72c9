import { createPrivateKey, X509Certificate } from 'node:crypto';
import { readPrivateFile } from './secrets.ts';
import { readTextFile } from './textFile.ts';

/** Where the certificate of the review page and its key stand. Read anew at each start and reload, so that a renewed one is picked up. */
export interface TlsFiles {
  readonly certificateFile: string;
  readonly keyFile: string;
}

export interface TlsIdentity {
  /** PEM: the certificate, then those that vouch for it. */
  readonly certificates: string;
  readonly key: Buffer;
  readonly certificate: X509Certificate;
}

export type TlsFileProblem = { readonly which: keyof TlsFiles; readonly problem: string };

const LARGEST_KEY_BYTES = 64 * 1024;

export function readTls({ certificateFile, keyFile }: TlsFiles): TlsIdentity | TlsFileProblem {
  const chain = readTextFile(certificateFile);
  if ('problem' in chain) return { which: 'certificateFile', problem: `${certificateFile} ${chain.problem}` };
  const certificate = attempt(() => new X509Certificate(chain.text));
  if (certificate === null)
    return { which: 'certificateFile', problem: `${certificateFile} holds no certificate in PEM form` };
  const pem = readPrivateFile(keyFile, LARGEST_KEY_BYTES);
  if ('problem' in pem) return { which: 'keyFile', problem: pem.problem };
  const key = attempt(() => createPrivateKey(pem.bytes));
  if (key === null)
    return { which: 'keyFile', problem: `${keyFile} holds no private key in PEM form, or one with a passphrase` };
  if (!certificate.checkPrivateKey(key)) {
    return { which: 'keyFile', problem: `${keyFile} is not the key of the certificate in ${certificateFile}` };
  }
  return { certificates: chain.text, key: pem.bytes, certificate };
}

function attempt<Result>(work: () => Result): Result | null {
  try {
    return work();
  } catch {
    return null;
  }
}
