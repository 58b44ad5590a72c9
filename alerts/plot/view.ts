import type { EventPicture, PicturePoint } from '../../detectors/steps/pulsarEvent.ts';

/** What part of the picture is drawn: enough of the quiet time before to judge the event by, but not so much that the event is a sliver. */
export interface View {
  readonly from: number;
  readonly to: number;
  readonly points: readonly PicturePoint[];
}

/** The time before the event is at most so many times the time after it … */
const BEFORE_TO_AFTER = 3;
/** … but never less than this, nor than so many arrivals. */
const LEAST_DAYS_BEFORE = 30;
const LEAST_ARRIVALS_BEFORE = 12;

export function viewOf(picture: EventPicture): View {
  const points = picture.points.toSorted((a, b) => a.mjd - b.mjd || (a.key < b.key ? -1 : 1));
  const epoch = picture.epochMjd;
  const last = Math.max(epoch, picture.epochInterval68[1], ...points.map((p) => p.mjd));
  const before = points.filter((p) => p.mjd <= epoch);
  const oldestKept = before.at(-LEAST_ARRIVALS_BEFORE)?.mjd ?? before[0]?.mjd ?? epoch - 1;
  const span = Math.max(LEAST_DAYS_BEFORE, BEFORE_TO_AFTER * (last - epoch));
  const from = Math.max(
    Math.min(epoch - span, oldestKept),
    Math.min(before[0]?.mjd ?? epoch - 1, picture.epochInterval68[0]),
  );
  const air = Math.max(0.5, 0.025 * (last - from));
  return { from: from - air, to: last + air, points: points.filter((p) => p.mjd >= from - air) };
}

export interface CurvePoint {
  readonly mjd: number;
  readonly value: number;
}

/** The fit between its samples; null outside them. At a step (two samples at one instant) the earlier side counts up to it. */
export function interpolate(fit: readonly CurvePoint[], mjd: number): number | null {
  for (let i = 1; i < fit.length; i++) {
    const a = fit[i - 1]!;
    const b = fit[i]!;
    if (mjd < a.mjd || mjd > b.mjd || b.mjd === a.mjd) continue;
    return a.value + ((mjd - a.mjd) / (b.mjd - a.mjd)) * (b.value - a.value);
  }
  return null;
}

/** The samples inside the view, with the two ends where the curve crosses its border. */
export function clipped(fit: readonly CurvePoint[], view: View): readonly CurvePoint[] {
  const inside = fit.filter((p) => p.mjd >= view.from && p.mjd <= view.to);
  const start = interpolate(fit, view.from);
  const end = interpolate(fit, view.to);
  return [
    ...(start === null ? [] : [{ mjd: view.from, value: start }]),
    ...inside,
    ...(end === null ? [] : [{ mjd: view.to, value: end }]),
  ];
}
