import type { CurrentModel } from '../detectors/index.ts';
import { formatDoubleDouble } from '../detectors/spin/doubleDouble.ts';
import { formatMjd } from '../detectors/time/mjd.ts';
import { pulsarFileText } from './config/pulsarFileText.ts';

/** A pulsar's current model for others: as a file of the models folder, and as JSON. The same for the command and the written files. */

/** @param name of the pulsar's events in the model, as they are called today */
export function modelToml(current: CurrentModel, events: readonly ModelEvent[]): string {
  return pulsarFileText(current.model, remarks(current, events));
}

export interface ModelEvent {
  readonly id: string;
  readonly name: string;
  readonly epochMjd: number;
}

/** Digits that a double would lose are texts: the frequency and the epochs. */
export function modelJson(current: CurrentModel, events: readonly ModelEvent[]): unknown {
  const { model, ...facts } = current;
  const { spin } = model;
  return {
    pulsar: model.name,
    timeScale: 'TDB',
    epochMjd: formatMjd(spin.epochTdb),
    frequencyHz: formatDoubleDouble(spin.frequencyHz),
    frequencyDerivativeHzPerS: spin.frequencyDerivativeHzPerS,
    frequencySecondDerivativeHzPerS2: spin.frequencySecondDerivativeHzPerS2,
    higherFrequencyDerivatives: spin.higherFrequencyDerivatives ?? [],
    phaseAtEpochTurns: spin.phaseAtEpochTurns ?? 0,
    glitches: model.glitches.map(({ epochTdb, ...glitch }) => ({ epochMjd: formatMjd(epochTdb), ...glitch })),
    ...facts,
    events,
  };
}

function remarks(current: CurrentModel, events: readonly ModelEvent[]): string[] {
  const { model, ahead, lastArrivalMjd, validFromMjd, validUntilMjd } = current;
  const later = ahead.map(({ days, turns }) => `${turns.toPrecision(2)} turn after ${days} d`).join(', ');
  return [
    `${model.name}: the spin-down model of now, as followed by spinvigil through ${current.arrivals} arrivals until MJD ${lastArrivalMjd.toFixed(3)}.`,
    ...(current.locked ? [] : ['NOT YET RELIABLE: too few arrivals, the count of turns is not certain.']),
    ...events.map(({ id, name, epochMjd }) => `Holds ${name} ${id}, MJD ${epochMjd.toFixed(3)}.`),
    ...(events.length === 0 ? [] : ['A candidate must be vetted before it is announced.']),
    `Phase good to 0.1 turn from MJD ${validFromMjd.toFixed(2)} to MJD ${validUntilMjd.toFixed(2)}; arrivals in that span: rms ${current.rmsTurns.toPrecision(2)} turn.`,
    `Uncertainty (1 sigma): ${later}; frequency ${current.frequencyUncertaintyHz.toPrecision(2)} Hz.`,
    driftText(current),
  ];
}

/** When folding with the model of the models folder smears the pulse. */
function driftText({ startModel }: CurrentModel): string {
  const { tenthOfTurnMjd, reached, sinceMjd } = startModel;
  const since = `since MJD ${sinceMjd.toFixed(2)}`;
  if (tenthOfTurnMjd === null) return `The start model will not drift by 0.1 turn ${since} within ten years.`;
  const when = `MJD ${tenthOfTurnMjd.toFixed(2)}`;
  return reached
    ? `The start model had drifted by 0.1 turn ${since} at ${when}: do not fold with it.`
    : `The start model will have drifted by 0.1 turn ${since} at ${when}.`;
}
