import { unitFor } from '../../../alerts/plot/scale.ts';
import { interpolate, viewOf } from '../../../alerts/plot/view.ts';
import { superscript } from '../../../alerts/wording/numbers.ts';
import type { EventPicture } from '../../../detectors/steps/pulsarEvent.ts';
import { mjdAndDay } from '../pages/wording.ts';
import type { Chart, ChartMark } from './chart.ts';

/** The panels of one event, above one another on one axis of time. */

const TALL = 250;
const LOW = 170;

/** The fraction of the axis that stays free at each end. */
const SIDE_AIR = 0.02;

export function eventCharts(picture: EventPicture): readonly Chart[] {
  const view = viewOf(picture);
  const air = SIDE_AIR * (view.to - view.from);
  const shared = {
    epoch: [picture.epochInterval68[0], picture.epochMjd, picture.epochInterval68[1]] as const,
    domain: [view.from - air, view.to + air] as const,
  };
  return [
    { ...shared, ...deviation(picture), id: 'chart-deviation', height: TALL },
    { ...shared, ...residual(picture), id: 'chart-residual', height: LOW },
    { ...shared, ...frequency(picture), id: 'chart-frequency', height: LOW + 20 },
    ...((picture.spinDownTrack ?? []).length === 0
      ? []
      : [{ ...shared, ...spinDown(picture), id: 'chart-spin-down', height: LOW + 20 }]),
  ];
}

type Panel = Pick<Chart, 'heading' | 'unit' | 'marks' | 'curve' | 'summary'>;

function deviation(picture: EventPicture): Panel {
  return {
    heading: 'Phase deviation before the fit, with the fit',
    unit: 'turns, late is up',
    marks: phaseMarks(picture, (point) => point.deviationTurns),
    curve: picture.fit.map((p) => [p.mjd, p.deviationTurns]),
    summary: `Phase deviation of ${picture.points.length} arrivals against the spin-down before the event, with the fitted curve.`,
  };
}

function residual(picture: EventPicture): Panel {
  const fit = picture.fit.map((p) => ({ mjd: p.mjd, value: p.deviationTurns }));
  const [first, last] = [picture.fit[0]?.mjd ?? 0, picture.fit.at(-1)?.mjd ?? 0];
  return {
    heading: 'After the fit',
    unit: 'turns, late is up',
    marks: phaseMarks(picture, (point) => {
      const fitted = interpolate(fit, point.mjd);
      return fitted === null ? null : point.deviationTurns - fitted;
    }),
    curve: [
      [first, 0],
      [last, 0],
    ],
    summary: 'What the fit leaves of the phase deviation, arrival by arrival.',
  };
}

function phaseMarks(
  picture: EventPicture,
  value: (point: EventPicture['points'][number]) => number | null,
): readonly ChartMark[] {
  return picture.points.flatMap((point) => {
    const y = value(point);
    if (y === null) return [];
    const error = point.uncertaintyTurns;
    const late = withError(y / picture.frequencyHz, error / picture.frequencyHz, 's');
    const says = `${at(point.mjd)}: ${fixed(y, error)} turns (${late})${point.used ? '' : ', set aside'}`;
    return [{ mjd: point.mjd, y, error, kind: point.used ? sideOf(picture, point.mjd) : 'aside', says }];
  });
}

function frequency(picture: EventPicture): Panel {
  const { frequencyTrack, frequencyFit } = picture;
  const largest = Math.max(0, ...[...frequencyTrack, ...frequencyFit].map((p) => Math.abs(p.deltaNuHz)));
  const [factor, unit] = unitFor(largest, 'Hz');
  return {
    heading: 'Δν from sliding local fits',
    unit: `${unit} above the spin-down before`,
    marks: frequencyTrack.map((p) => ({
      mjd: p.mjd,
      y: p.deltaNuHz / factor,
      error: p.uncertaintyHz / factor,
      kind: sideOf(picture, p.mjd),
      says: `${at(p.mjd)}: Δν ${fixed(p.deltaNuHz / factor, p.uncertaintyHz / factor)} ${unit}`,
    })),
    curve: frequencyFit.map((p) => [p.mjd, p.deltaNuHz / factor]),
    summary: 'Spin frequency from short local fits, never across the event, with the fitted step.',
  };
}

/** In a power of a thousand of Hz/s that suits the fitted values and their errors. */
function spinDown(picture: EventPicture): Panel {
  const track = picture.spinDownTrack ?? [];
  const fit = picture.spinDownFit ?? [];
  const largest = Math.max(1e-30, ...[...track, ...fit].map((p) => Math.abs(p.deltaNuDot)));
  const exponent = 3 * Math.floor(Math.log10(largest) / 3);
  const factor = 10 ** exponent;
  const unit = `10${superscript(exponent)} Hz/s`;
  return {
    heading: 'Δν̇ from sliding local fits',
    unit: `${unit} above the spin-down before`,
    marks: track.map((p) => ({
      mjd: p.mjd,
      y: p.deltaNuDot / factor,
      error: p.uncertainty / factor,
      kind: sideOf(picture, p.mjd),
      says: `${at(p.mjd)}: Δν̇ ${fixed(p.deltaNuDot / factor, p.uncertainty / factor)} × ${unit}`,
    })),
    curve: fit.map((p) => [p.mjd, p.deltaNuDot / factor]),
    summary: 'Spin-down rate from short local fits, never across the event, with the fitted change.',
  };
}

function sideOf({ epochMjd }: EventPicture, mjd: number): 'before' | 'after' {
  return mjd > epochMjd ? 'after' : 'before';
}

function at(mjd: number): string {
  const [text, day] = mjdAndDay(mjd);
  return `${text}, ${day}`;
}

/** Value and uncertainty to two digits of the uncertainty, zero within it or not: a plot hides no value. */
function fixed(value: number, error: number): string {
  const decimals = error > 0 ? Math.max(0, Math.min(12, 1 - Math.floor(Math.log10(error)))) : 6;
  return `${value < 0 ? '−' : ''}${Math.abs(value).toFixed(decimals)} ± ${error.toFixed(decimals)}`;
}

function withError(value: number, error: number, unit: string): string {
  const [factor, name] = unitFor(Math.max(Math.abs(value), error), unit);
  return `${fixed(value / factor, error / factor)} ${name}`;
}
