import { type Markup, markup } from './markup.ts';

/**
 * The pieces of a mail in HTML: tables and inline styles, because many mail programs know nothing else; one column, so that a phone
 * shows it without zooming. Colours for the dark come in one style block, for the programs that read it.
 */

const TEXT = '#1b2330';
const FAINT = '#5b6675';
const RULE = '#d9dee6';
const FONT = "font-family:-apple-system,'Segoe UI',Roboto,'Helvetica Neue',Arial,sans-serif;";

/** What the strip on top says at a glance; the words say it too. */
export type Tone = 'candidate' | 'update' | 'withdrawal' | 'drill' | 'calm';

const TONES: Readonly<Record<Tone, string>> = {
  candidate: '#d1600a',
  update: '#2f5d9b',
  withdrawal: '#5b6675',
  drill: '#7a4fa3',
  calm: '#3d7a57',
};

export interface Page {
  readonly title: string;
  /** What a phone shows under the subject before the mail is opened. */
  readonly preview: string;
  readonly tone: Tone;
  readonly blocks: readonly (Markup | null)[];
  /** The last, small line. */
  readonly footer: string;
}

export function page({ title, preview, tone, blocks, footer }: Page): string {
  return markup`<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<meta name="supported-color-schemes" content="light dark">
<title>${title}</title>
<style>
:root { color-scheme: light dark; }
@media (prefers-color-scheme: dark) {
  .ground { background: #12161d !important; }
  .sheet { background: #1a2029 !important; }
  .ink { color: #eef1f5 !important; }
  .faint { color: #a3adba !important; }
  .rule { border-color: #313a47 !important; }
  .link { color: #9cc3f5 !important; }
}
</style>
</head>
<body class="ground" style="margin:0;padding:0;background:#eef0f4;">
<div style="display:none;max-height:0;overflow:hidden;">${preview}</div>
<table role="presentation" class="ground" width="100%" cellpadding="0" cellspacing="0" style="background:#eef0f4;">
<tr><td align="center" style="padding:12px 8px;">
<table role="presentation" class="sheet" width="100%" cellpadding="0" cellspacing="0" style="max-width:640px;background:#ffffff;border-radius:8px;">
<tr><td style="height:8px;line-height:8px;font-size:0;background:${TONES[tone]};border-radius:8px 8px 0 0;">&nbsp;</td></tr>
<tr><td style="padding:16px 20px 20px;">
${blocks}<p class="faint rule" style="${FONT}font-size:13px;line-height:19px;color:${FAINT};border-top:1px solid ${RULE};margin:24px 0 0;padding-top:12px;">${footer}</p>
</td></tr>
</table>
</td></tr>
</table>
</body>
</html>
`.source;
}

export function title(text: string, small: string): Markup {
  return markup`<p class="faint" style="${FONT}font-size:14px;line-height:20px;color:${FAINT};margin:0;">${small}</p>
<h1 class="ink" style="${FONT}font-size:24px;line-height:30px;color:${TEXT};margin:2px 0 6px;">${text}</h1>
`;
}

/** The one number of the mail. */
export function figure(text: string): Markup | null {
  if (text === '') return null;
  return markup`<p class="ink" style="${FONT}font-size:22px;line-height:28px;font-weight:600;color:${TEXT};margin:0 0 10px;">${text}</p>
`;
}

export function heading(text: string): Markup {
  return markup`<h2 class="ink" style="${FONT}font-size:17px;line-height:24px;color:${TEXT};margin:22px 0 6px;">${text}</h2>
`;
}

export function paragraph(text: string, weight: 'normal' | 'strong' = 'normal'): Markup {
  const bold = weight === 'strong' ? 'font-weight:600;' : '';
  return markup`<p class="ink" style="${FONT}font-size:16px;line-height:24px;${bold}color:${TEXT};margin:0 0 10px;">${text}</p>
`;
}

export function list(items: readonly string[]): Markup {
  const rows = items.map(
    (
      item,
    ) => markup`<li class="ink" style="${FONT}font-size:16px;line-height:23px;color:${TEXT};margin:0 0 6px;overflow-wrap:anywhere;">${item}</li>
`,
  );
  return markup`<ul style="margin:0 0 6px;padding-left:20px;">
${rows}</ul>
`;
}

export function rowTable(rows: readonly { readonly label: string; readonly value: string }[]): Markup {
  const cells = rows.map(
    ({ label, value }) => markup`<tr>
<td class="faint rule" width="34%" style="${FONT}font-size:14px;line-height:21px;color:${FAINT};border-bottom:1px solid ${RULE};padding:5px 8px 5px 0;vertical-align:top;">${label}</td>
<td class="ink rule" style="${FONT}font-size:15px;line-height:21px;color:${TEXT};border-bottom:1px solid ${RULE};padding:5px 0;vertical-align:top;overflow-wrap:anywhere;">${value}</td>
</tr>
`,
  );
  return markup`<table width="100%" cellpadding="0" cellspacing="0" style="margin:6px 0 12px;">
${cells}</table>
`;
}

/** The address is written out, so that it is seen before it is followed. */
export function link(label: string, address: string): Markup {
  return markup`<p class="ink" style="${FONT}font-size:16px;line-height:24px;color:${TEXT};margin:12px 0 0;overflow-wrap:anywhere;">${label}: <a class="link" href="${address}" style="color:#2f5d9b;">${address}</a></p>
`;
}

export function picture(cid: string, description: string): Markup {
  return markup`<img src="cid:${cid}" width="600" alt="${description}" style="display:block;width:100%;max-width:600px;height:auto;border:0;border-radius:6px;margin:10px 0 14px;">
`;
}
