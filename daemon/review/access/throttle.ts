/**
 * Lets so many tries pass at once, and then one each `refillMs`. For each key a bucket; the table of them has a largest size, so that
 * somebody who asks under many names fills no memory. Pure but for the clock handed in.
 */
export interface Throttle {
  /** Takes one try; 0: it may be made, else the milliseconds until one may. */
  take(key: string): number;
  /** The key is known to be good: its tries come back. */
  forgive(key: string): void;
  readonly size: number;
}

export interface ThrottleOptions {
  readonly tries: number;
  readonly refillMs: number;
  readonly mostKeys: number;
  readonly monotonicMs: () => number;
}

interface Bucket {
  tries: number;
  atMs: number;
}

export function createThrottle({ tries, refillMs, mostKeys, monotonicMs }: ThrottleOptions): Throttle {
  // In the order of use: the one that was used longest ago stands first.
  const buckets = new Map<string, Bucket>();
  const levelOf = ({ tries: left, atMs }: Bucket, nowMs: number) => Math.min(tries, left + (nowMs - atMs) / refillMs);

  return {
    take(key) {
      const nowMs = monotonicMs();
      const known = buckets.get(key);
      const left = known === undefined ? tries : levelOf(known, nowMs);
      buckets.delete(key);
      const [oldest] = buckets.keys();
      if (buckets.size >= mostKeys && oldest !== undefined) buckets.delete(oldest);
      buckets.set(key, { tries: left >= 1 ? left - 1 : left, atMs: nowMs });
      return left >= 1 ? 0 : Math.ceil((1 - left) * refillMs);
    },
    forgive: (key) => void buckets.delete(key),
    get size() {
      return buckets.size;
    },
  };
}
