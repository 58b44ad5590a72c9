import { CHART_STYLE } from './chartStyle.ts';
import { LAYOUT_STYLE } from './layoutStyle.ts';

/**
 * Colours by meaning, in daylight and for a dark control room. Every text colour stands at 4.5 : 1 or better on both of
 * its grounds (WCAG 2.2, 1.4.3, level AA); a test measures it.
 */
export const DAY = {
  paper: '#f6f3ec',
  panel: '#fffdf8',
  ink: '#21272b',
  quiet: '#586067',
  line: '#d8d1c3',
  link: '#1b5872',
  waiting: '#8a5200',
  accepted: '#1f6747',
  rejected: '#99303f',
  suspected: '#5a4889',
  focus: '#b4530a',
  track: '#e6e0d3',
  fill: '#47758a',
  before: '#2a5f86',
  after: '#b4530a',
  epoch: '#e3c488',
} as const;

export const NIGHT: Readonly<Record<keyof typeof DAY, string>> = {
  paper: '#10161b',
  panel: '#172027',
  ink: '#dcd7cb',
  quiet: '#98a3a9',
  line: '#2b3740',
  link: '#8fc6dd',
  waiting: '#e9b872',
  accepted: '#82c9a2',
  rejected: '#e9929d',
  suspected: '#b9aae6',
  focus: '#ffcf8a',
  track: '#26323a',
  fill: '#6fa3ba',
  before: '#86bfe6',
  after: '#f2a65a',
  epoch: '#6b5421',
};

function custom(colours: Readonly<Record<string, string>>): string {
  return Object.entries(colours)
    .map(([name, value]) => `--${name}: ${value};`)
    .join(' ');
}

/** The system's light, unless the reader chose one. Paper is always by day. */
export const STYLE = `:root { color-scheme: light dark; ${custom(DAY)} }
:root[data-light="day"] { color-scheme: light; }
@media screen and (prefers-color-scheme: dark) { :root:not([data-light="day"]) { ${custom(NIGHT)} } }
@media screen { :root[data-light="night"] { color-scheme: dark; ${custom(NIGHT)} } }
${LAYOUT_STYLE}${CHART_STYLE}`;
