import { instantOfMjd } from '../clock.ts';
import { type HealthSources, pulse } from '../health.ts';
import type { VitalSigns } from '../review/desk.ts';
import { type Family, openMetricsText } from './openMetrics.ts';

/** What a monitoring system may want to know of the watch. Names are ours and begin with `spinvigil_`. */
export interface MetricSources extends HealthSources {
  readonly vitalSigns: () => VitalSigns;
  /** Lines of the log that nobody took. */
  readonly droppedLogLines: () => number;
}

export function watchMetrics(sources: MetricSources): string {
  const signs = sources.vitalSigns();
  return openMetricsText([
    ...programFamilies(signs, sources),
    ...feedFamilies(sources),
    ...recordFamilies(sources),
    ...mailFamilies(sources),
    ...stageFamilies(signs),
  ]);
}

function programFamilies(signs: VitalSigns, { clock, droppedLogLines }: MetricSources): Family[] {
  const upSeconds = (clock.now().getTime() - Date.parse(signs.startedAt)) / 1000;
  return [
    {
      name: 'spinvigil_build',
      type: 'info',
      help: 'Versions.',
      samples: [{ labels: { ...signs.versions }, value: 1 }],
    },
    gauge('spinvigil_uptime_seconds', 'Since the daemon started.', upSeconds, 'seconds'),
    gauge('spinvigil_resident_memory_bytes', 'Memory of the process.', signs.residentBytes, 'bytes'),
    gauge('spinvigil_record_size_bytes', 'Size of the database.', signs.recordBytes, 'bytes'),
    counter('spinvigil_log_lines_dropped', 'Log lines that nobody took.', droppedLogLines()),
  ];
}

function feedFamilies({ configuration, store, clock, intake }: MetricSources): Family[] {
  const last = store.lastFileByFeed();
  const statuses = intake?.status() ?? [];
  return [
    {
      name: 'spinvigil_feed_last_file_age_seconds',
      type: 'gauge',
      unit: 'seconds',
      help: 'Since the last file of the feed was taken in.',
      samples: configuration.feeds.flatMap(({ name: feed }) => {
        const at = last.get(feed);
        return at === undefined ? [] : { labels: { feed }, value: (clock.now().getTime() - Date.parse(at)) / 1000 };
      }),
    },
    {
      name: 'spinvigil_feed_files',
      type: 'gauge',
      help: 'Files in the folder of the feed.',
      samples: statuses.flatMap(({ feed, files }) => (files === null ? [] : { labels: { feed }, value: files })),
    },
    {
      name: 'spinvigil_feed_problems',
      type: 'gauge',
      help: 'Problems with the folder of the feed or files in it.',
      samples: statuses.map(({ feed, problems }) => ({ labels: { feed }, value: problems.length })),
    },
  ];
}

function recordFamilies({ store, configuration }: MetricSources): Family[] {
  const counts = store.counts();
  const states = ['suspected', 'confirmed', 'withdrawn', 'accepted', 'rejected'];
  const reports = store.pulsarReports();
  return [
    counter('spinvigil_files', 'Files taken in.', counts.files),
    counter('spinvigil_arrivals', 'Arrivals put on record.', counts.arrivals),
    counter('spinvigil_quarantined_rows', 'Rows that could not be used.', counts.quarantinedRows),
    counter('spinvigil_verdicts', 'Verdicts signed.', counts.verdicts),
    {
      name: 'spinvigil_events',
      type: 'gauge',
      help: 'Events on record, by state.',
      samples: states.map((state) => ({ labels: { state }, value: counts.eventsByState[state] ?? 0 })),
    },
    gauge('spinvigil_pulsars', 'Pulsars with a model.', configuration.models.size),
    gauge(
      'spinvigil_pulsars_not_locked',
      'Pulsars whose pulse count is open, so that their alerts are held.',
      reports.filter(({ locked }) => !locked).length,
    ),
  ];
}

function mailFamilies(sources: MetricSources): Family[] {
  const { oldestWaitingSince, delivered, refused, expired, queued, attempting } = sources.store.outboxCounts();
  const waited = oldestWaitingSince === null ? 0 : sources.clock.now().getTime() - Date.parse(oldestWaitingSince);
  return [
    gauge('spinvigil_mail_waiting', 'Messages that wait to be sent, one for each recipient.', queued + attempting),
    gauge('spinvigil_mail_oldest_wait_seconds', 'How long the oldest of them has waited.', waited / 1000, 'seconds'),
    gauge('spinvigil_mail_blocked', '1 while mail does not leave.', pulse(sources).mailBlocked ? 1 : 0),
    counter('spinvigil_mail_delivered', 'Messages delivered.', delivered),
    counter('spinvigil_mail_refused', 'Messages refused for good.', refused),
    counter('spinvigil_mail_expired', 'Messages given up or replaced before they left.', expired),
  ];
}

function stageFamilies({ stages, tables }: VitalSigns): Family[] {
  return [
    {
      name: 'spinvigil_stage_progress_age_seconds',
      type: 'gauge',
      unit: 'seconds',
      help: 'Since a part of the watch made progress.',
      samples: stages.map((stage) => ({ labels: { stage: stage.name }, value: stage.secondsSinceProgress })),
    },
    {
      name: 'spinvigil_stage_late',
      type: 'gauge',
      help: '1 while a part of the watch has made no progress for longer than its limit.',
      samples: stages.map((stage) => ({ labels: { stage: stage.name }, value: stage.late ? 1 : 0 })),
    },
    {
      name: 'spinvigil_table_end_seconds',
      type: 'gauge',
      unit: 'seconds',
      help: 'When a table ends, Unix time.',
      samples: tables.flatMap(({ name: table, endsMjd }) =>
        endsMjd === null ? [] : { labels: { table }, value: instantOfMjd(endsMjd).getTime() / 1000 },
      ),
    },
  ];
}

function gauge(name: string, help: string, value: number, unit?: Family['unit']): Family {
  return { name, type: 'gauge', ...(unit === undefined ? {} : { unit }), help, samples: [{ value }] };
}

function counter(name: string, help: string, value: number): Family {
  return { name, type: 'counter', help, samples: [{ value }] };
}
