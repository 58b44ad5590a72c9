/**
 * Metrics as text of the OpenMetrics specification, version 1.0.0. A family has one type; its name carries the unit as its last part, and a
 * counter's samples end in `_total`. Pure.
 */
export interface Family {
  /** Without a suffix of its samples. */
  readonly name: string;
  readonly type: 'gauge' | 'counter' | 'info';
  readonly unit?: 'seconds' | 'bytes';
  readonly help: string;
  readonly samples: readonly Sample[];
}

export interface Sample {
  readonly labels?: Readonly<Record<string, string>>;
  readonly value: number;
}

const SUFFIX = { gauge: '', counter: '_total', info: '_info' } as const;

/** A family without samples is left out. */
export function openMetricsText(families: readonly Family[]): string {
  const lines = families.flatMap(({ name, type, unit, help, samples }) =>
    samples.length === 0
      ? []
      : [
          `# TYPE ${name} ${type}`,
          ...(unit === undefined ? [] : [`# UNIT ${name} ${unit}`]),
          `# HELP ${name} ${escapedHelp(help)}`,
          ...samples.map(({ labels, value }) => `${name}${SUFFIX[type]}${labelText(labels)} ${numberText(value)}`),
        ],
  );
  return `${[...lines, '# EOF'].join('\n')}\n`;
}

function labelText(labels: Sample['labels']): string {
  const pairs = Object.entries(labels ?? {}).map(([name, value]) => `${name}="${escapedLabel(value)}"`);
  return pairs.length === 0 ? '' : `{${pairs.join(',')}}`;
}

function escapedLabel(text: string): string {
  return escapedHelp(text).replaceAll('"', '\\"');
}

function escapedHelp(text: string): string {
  return text.replaceAll('\\', '\\\\').replaceAll('\n', '\\n');
}

function numberText(value: number): string {
  if (Number.isNaN(value)) return 'NaN';
  return Number.isFinite(value) ? String(value) : value > 0 ? '+Inf' : '-Inf';
}
