import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';

/** The event as `events --json` prints it, two-space indented, with a final line feed. */
export function eventJson(event: PulsarEvent): string {
  return `${JSON.stringify(event, null, 2)}\n`;
}
