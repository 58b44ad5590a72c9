/**
 * When a file has stopped changing: two looks at least `settleMs` apart on a clock that only grows, with the same signature at
 * every look between them. Wall time and modification time take no part: a writer can set the one, an operator the other.
 */
export interface Stillness {
  readonly signature: string;
  /** Monotonic time of the first look that found this signature. */
  readonly sinceMs: number;
}

export function stillness(earlier: Stillness | undefined, signature: string, nowMs: number): Stillness {
  return earlier?.signature === signature ? earlier : { signature, sinceMs: nowMs };
}

export function isSettled(file: Stillness, nowMs: number, settleMs: number): boolean {
  return nowMs > file.sinceMs && nowMs - file.sinceMs >= settleMs;
}
