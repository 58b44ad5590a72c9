import { closeSync, constants, fstatSync, openSync, readSync, realpathSync } from 'node:fs';
import { readSpkKernel } from '../../detectors/sky/spkFile.ts';
import type { SpkKernel } from '../../detectors/sky/spkKernel.ts';

/** The dates that the built-in table of TDB − TT covers; a kernel may hold thirty thousand years, and the rest is left on disk. */
const WANTED = { fromMjd: 40_500, toMjd: 73_500 };

/** The kernels that the configuration and the models name: each file is read once and shared. */
export interface KernelShelf {
  /** By the path that was asked for. */
  readonly kernels: ReadonlyMap<string, SpkKernel>;
  /** A problem is the rest of a sentence that begins with the file. */
  take(file: string): { readonly kernel: SpkKernel } | { readonly problem: string };
}

export function createKernelShelf(): KernelShelf {
  const kernels = new Map<string, SpkKernel>();
  const read = new Map<string, ReturnType<typeof readKernelFile>>();
  return {
    kernels,
    take(file) {
      const found = settle(file);
      if (typeof found !== 'string') return found;
      const taken = read.get(found) ?? readKernelFile(found, file);
      read.set(found, taken);
      if ('kernel' in taken) kernels.set(file, taken.kernel);
      return taken;
    },
  };
}

function settle(file: string): string | { readonly problem: string } {
  try {
    return realpathSync(file);
  } catch (error) {
    return { problem: inWords(error) };
  }
}

/** Reads Earth and Sun out of an SPK kernel, and no more of the file than that. */
function readKernelFile(file: string, name: string): { readonly kernel: SpkKernel } | { readonly problem: string } {
  let descriptor: number | null = null;
  try {
    // Not blocking, so that a pipe in the kernel's place cannot hold up the start.
    descriptor = openSync(file, constants.O_RDONLY | constants.O_NONBLOCK);
    const stat = fstatSync(descriptor);
    if (!stat.isFile()) return { problem: 'is not a regular file' };
    const source = { byteLength: stat.size, bytes: bytesOf(descriptor) };
    return readSpkKernel(source, { name, ...WANTED });
  } catch (error) {
    return { problem: inWords(error) };
  } finally {
    if (descriptor !== null) closeSync(descriptor);
  }
}

function bytesOf(descriptor: number): (from: number, to: number) => Uint8Array {
  return (from, to) => {
    const bytes = new Uint8Array(to - from);
    for (let done = 0; done < bytes.length; ) {
      const count = readSync(descriptor, bytes, done, bytes.length - done, from + done);
      if (count === 0) throw new Error('the file became shorter while it was read');
      done += count;
    }
    return bytes;
  };
}

function inWords(error: unknown): string {
  const { code, message } = error as NodeJS.ErrnoException;
  if (code === 'ENOENT' || code === 'ENOTDIR') return 'does not exist';
  if (code === 'EACCES') return 'cannot be read by this user';
  return `cannot be read (${code ?? message})`;
}
