import type { EventState } from '../../detectors/steps/pulsarEvent.ts';

/** Words that options take. */
export const STATES: readonly EventState[] = ['suspected', 'confirmed', 'withdrawn', 'accepted', 'rejected'];
export const NOTICE_FORMS = ['voevent', 'json', 'csv'] as const;
export type NoticeForm = (typeof NOTICE_FORMS)[number];
