/** The library's one door: what others may call, in the order of the data. Everything else is free to change. */

export type { BarycentredArrival, Delays, Quality, ReceivedArrival, TimedArrival } from './arrival.ts';
export type { DetectionLimit } from './limits/detectionLimit.ts';
export { type EventPlan, openPlan, type Plan, planFor } from './plan/plan.ts';
export type {
  ArrivalVerdict,
  DetectorSettings,
  NoiseModel,
  PulsarReport,
} from './report.ts';
export type { BelievedStep } from './site/belief.ts';
export { knownSteps } from './site/knownSteps.ts';
export { type PulsarTimes, pulsarTimes } from './site/pulsarTimes.ts';
export { siteEvents } from './site/siteEvents.ts';
export type { SiteStep } from './site/siteStep.ts';
export { SiteClocks, siteSteps } from './site/siteSteps.ts';
export { barycentre } from './sky/barycentre.ts';
export type { PulsarModel } from './spin/pulsarModel.ts';
export { phaseEvaluator } from './spin/spinDownModel.ts';
export { advance } from './steps/advance.ts';
export { type CurrentModel, currentModel } from './steps/currentModel.ts';
export type {
  EventContext,
  EventPicture,
  EventState,
  Explanation,
  Interval,
  PulsarEvent,
} from './steps/pulsarEvent.ts';
export { type PulsarWatch, startWatch } from './steps/pulsarWatch.ts';
export { report } from './steps/report.ts';
export { detectorSettings } from './steps/threshold.ts';
