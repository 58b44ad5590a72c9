import type { EventRecord } from '../../../daemon/records.ts';
import { type DeskTexts, sampleRecord } from '../../support/reviewDesk.ts';

/** Texts that would run or break out if any page forgot to escape one. */
export const PAYLOADS = [
  '<script>globalThis.hit = 1</script>',
  '<img src=x onerror="globalThis.hit = 1">',
  '"><svg onload=globalThis.hit=1>',
  "' onfocus=globalThis.hit=1 autofocus x='",
  '" onmouseover="globalThis.hit = 1" x="',
  '</textarea><script>globalThis.hit = 1</script>',
  '</title><script>globalThis.hit = 1</script>',
  '</svg><script>globalThis.hit = 1</script>',
  '--><script>globalThis.hit = 1</script><!--',
  ']]><script>globalThis.hit = 1</script>',
  'javascript:globalThis.hit=1',
  '{{globalThis.hit=1}}',
  '&lt;script&gt;&#x3c;script&#x3e;',
  '<a href="http://evil.test/">x</a><base href="http://evil.test/">',
  '\u202egpj.exe\u0000\u001b[31m\u2028x',
  '<ſcript>＜script＞',
  // One string for many places: attribute, tag, comment, script, style, URL.
  'jaVasCript:/*-/*`/*\\`/*\'/*"/**/(/* */oNcliCk=globalThis.hit=1 )//%0D%0A//</stYle/</titLe/</teXtarEa/</scRipt/--!>\\x3csVg/<sVg/oNloAd=globalThis.hit=1//>\\x3e',
];

/** An event with the text wherever a name, a note or a reason may stand. */
export function hostileRecord(text: string): EventRecord {
  const record = sampleRecord({
    pulsar: text,
    pulsars: [text, text],
    site: text,
    explanations: { glitch: 0.9, [text]: 0.1 },
  });
  return {
    ...record,
    history: record.history.map((change) => ({ ...change, what: text })),
    verdicts: [{ verdict: 'reopen', by: text, note: text, at: '2026-12-01T04:00:00.000Z', revision: 1 }],
  };
}

export function hostileTexts(text: string): DeskTexts {
  return { file: text, reason: text, subject: text, problem: text };
}
