import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import type { Interval, PulsarEvent, RecoveryTerm } from '../../detectors/steps/pulsarEvent.ts';
import { type Markup, markup } from '../markup.ts';

/** The numbers of a notice, unrounded, each with unit, meaning and 68 % interval; what is not known is left out. */
export function whatParams(event: PulsarEvent, model: PulsarModel | null, revision: number): Markup[] {
  const site =
    event.site === null
      ? []
      : [
          textParam('site', event.site, 'meta.id;instr.obsty'),
          textParam('pulsars', event.pulsars.join(', '), 'meta.id'),
        ];
  const numbers = [
    ...steps(event),
    ...event.recovery.terms.flatMap(recovery),
    ...(model === null ? [] : reference(model)),
    ...evidence(event),
    { name: 'revision', value: revision, whole: true, ucd: 'meta.version', meaning: 'of this event on record' },
  ];
  return [
    textParam('pulsar', event.pulsar, 'meta.id;meta.main'),
    textParam('state', event.state, 'meta.code.status'),
    ...site,
    ...numbers.flatMap(numberParams),
  ];
}

interface Param {
  readonly name: string;
  readonly value: number | null;
  readonly interval68?: Interval | null;
  /** As VOUnits (IVOA Recommendation, version 1.0) spells it. */
  readonly unit?: string;
  /** A count. */
  readonly whole?: boolean;
  /** From the IVOA's controlled vocabulary (UCD1+). */
  readonly ucd?: string;
  readonly meaning: string;
}

function steps(event: PulsarEvent): Param[] {
  const step = (name: string, value: number | null, interval68: Interval | null, meaning: string): Param => ({
    name,
    value,
    interval68,
    meaning,
  });
  return [
    {
      ...step('epoch', event.epochMjd, event.epochInterval68, 'MJD, TDB at the barycentre'),
      unit: 'd',
      ucd: 'time.epoch',
    },
    {
      ...step(
        'delta_nu',
        event.deltaNuHz,
        event.deltaNuHzInterval68,
        'step in rotation frequency, positive is a spin-up',
      ),
      unit: 'Hz',
    },
    step('delta_nu_over_nu', event.deltaNuOverNu, event.deltaNuOverNuInterval68, 'relative step in rotation frequency'),
    {
      ...step(
        'delta_nu_dot',
        event.deltaNuDot,
        event.deltaNuDotInterval68,
        'step in the derivative of the rotation frequency',
      ),
      unit: 'Hz/s',
    },
    step(
      'delta_nu_dot_over_nu_dot',
      event.deltaNuDotOverNuDot,
      event.deltaNuDotOverNuDotInterval68,
      'relative step in that derivative',
    ),
    {
      ...step('time_step', event.timeStepUs, event.timeStepUsInterval68, 'step in arrival time, positive is late'),
      unit: 'us',
    },
  ];
}

function recovery(term: RecoveryTerm, index: number): Param[] {
  const name = `recovery_${index + 1}`;
  return [
    {
      name: `${name}_fraction`,
      value: term.fraction,
      interval68: term.fractionInterval68,
      meaning: 'part of the frequency step that decays',
    },
    {
      name: `${name}_timescale`,
      value: term.timescaleDays,
      interval68: term.timescaleDaysInterval68,
      unit: 'd',
      ucd: 'time.duration',
      meaning: 'e-folding time of the decay',
    },
  ];
}

function reference({ spin }: PulsarModel): Param[] {
  const epoch = spin.epochTdb.day + spin.epochTdb.fraction;
  return [
    {
      name: 'reference_epoch',
      value: epoch,
      unit: 'd',
      ucd: 'time.epoch',
      meaning: 'MJD (TDB) of the spin-down model',
    },
    {
      name: 'reference_nu',
      value: spin.frequencyHz.hi,
      unit: 'Hz',
      meaning: 'rotation frequency of the model at its epoch',
    },
    { name: 'reference_nu_dot', value: spin.frequencyDerivativeHzPerS, unit: 'Hz/s', meaning: 'its derivative' },
  ];
}

function evidence(event: PulsarEvent): Param[] {
  return [
    {
      name: 'first_arrival_after',
      value: event.firstArrivalMjd,
      unit: 'd',
      ucd: 'time.epoch',
      meaning: 'MJD of the first arrival after the event',
    },
    {
      name: 'arrivals_used',
      value: event.arrivalsUsed,
      whole: true,
      ucd: 'meta.number',
      meaning: 'arrivals that the numbers rest on',
    },
    { name: 'log_bayes_factor', value: event.logBayesFactor, ucd: 'stat.likelihood', meaning: 'natural logarithm' },
    {
      name: 'false_alerts_per_year',
      value: event.falseAlertsPerYearAtThisLevel,
      unit: 'yr**-1',
      meaning: 'expected from noise alone in the whole programme at this level',
    },
  ];
}

/** The value, and its interval as two more numbers, in a group. What is not known is left out. */
function numberParams({ name, value, interval68, unit, whole, ucd, meaning }: Param): Markup[] {
  if (value === null || !Number.isFinite(value)) return [];
  const attributes = markup`${unit === undefined ? null : markup` unit="${unit}"`}${ucd === undefined ? null : markup` ucd="${ucd}"`} dataType="${whole ? 'int' : 'float'}"`;
  const main = markup`<Param name="${name}" value="${value}"${attributes}><Description>${meaning}</Description></Param>`;
  if (!interval68) return [main];
  const end = (which: string, x: number) => markup`<Param name="${name}_${which}" value="${x}"${attributes}/>`;
  return [
    markup`<Group name="${name}" type="measurement with 68 % interval">${main}${end('low', interval68[0])}${end('high', interval68[1])}</Group>`,
  ];
}

function textParam(name: string, value: string, ucd: string): Markup {
  return markup`<Param name="${name}" value="${value}" ucd="${ucd}" dataType="string"/>`;
}
