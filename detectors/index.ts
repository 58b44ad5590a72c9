/** The library's one door: what others may call, in the order of the data. Everything else is free to change. */

export type { BarycentredArrival, Delays, Quality, ReceivedArrival, TimedArrival } from './arrival.ts';
export type {
  ArrivalVerdict,
  DetectorSettings,
  NoiseModel,
  PulsarReport,
} from './report.ts';
export { barycentre } from './sky/barycentre.ts';
export type { PulsarModel } from './spin/pulsarModel.ts';
export { phaseEvaluator } from './spin/spinDownModel.ts';
export { advance } from './steps/advance.ts';
export type { EventPicture, EventState, Explanation, Interval, PulsarEvent } from './steps/pulsarEvent.ts';
export { type PulsarWatch, startWatch } from './steps/pulsarWatch.ts';
export { report } from './steps/report.ts';
export { combineSiteEvents } from './steps/siteEvents.ts';
export { detectorSettings } from './steps/threshold.ts';
