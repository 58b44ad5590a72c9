import { html } from 'hono/html';
import type { EventState, PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { EventRecord, VerdictRecord } from '../../records.ts';
import { LONGEST_NAME, LONGEST_NOTE, type VerdictDraft } from '../verdictForm.ts';
import type { Html } from './layout.ts';
import { epochText, eventPath, ownProbability, sizeText, stateText, utc, VERDICT_PAST, visible } from './wording.ts';

/** What the form needs beside the event, and what came back when a verdict could not be signed. */
export interface VerdictSection {
  readonly token: string;
  readonly reviewers: readonly string[];
  /** Who is logged in and signs; null: nobody logs in here, and a name is given with the verdict. */
  readonly signer: string | null;
  readonly refused: RefusedVerdict | null;
}

export interface RefusedVerdict {
  readonly reason: string;
  readonly draft: VerdictDraft;
  /** Set when the event moved on meanwhile: the revision that the reviewer had before the eyes. */
  readonly judgedRevision: number | null;
}

type Verdict = VerdictRecord['verdict'];

/** What a reviewer may say next, in the order of the form. */
const CHOICES: Readonly<Record<EventState, readonly Verdict[]>> = {
  suspected: ['accept', 'reject'],
  confirmed: ['accept', 'reject'],
  withdrawn: ['accept', 'reject'],
  accepted: ['reopen', 'reject'],
  rejected: ['reopen', 'accept'],
};

const LABELS: Readonly<Record<Verdict, { readonly name: string; readonly means: string }>> = {
  accept: { name: 'Accept', means: 'vetted: it is what the explanation says' },
  reject: { name: 'Reject', means: 'it is not; the note says why' },
  reopen: { name: 'Reopen', means: 'back to waiting for a verdict' },
};

export function verdictForm(record: EventRecord, section: VerdictSection): Html {
  const draft = section.refused?.draft;
  return html`<form class="verdict" method="post" action="${eventPath(record.event.id)}/verdict" accept-charset="utf-8">
    <h2 id="verdict">Verdict</h2>
    ${section.refused === null ? '' : html`<p class="refused" role="alert">${section.refused.reason}</p>`}
    <input type="hidden" name="token" value="${section.token}">
    <input type="hidden" name="revision" value="${record.revision}">
    <fieldset><legend class="unseen">Verdict</legend>
      ${CHOICES[record.event.state].map((verdict) => choice(verdict, draft?.verdict === verdict))}
    </fieldset>
    ${signature(section, draft?.by ?? '')}
    <label for="note">Note <small>up to ${LONGEST_NOTE} characters</small></label>
    <textarea id="note" name="note" rows="4" maxlength="${LONGEST_NOTE}">
${draft?.note ?? ''}</textarea>
    <button type="submit">Sign the verdict</button>
    <p class="quiet">Kept for good with name, time and revision ${record.revision}.</p>
  </form>`;
}

function choice(verdict: Verdict, checked: boolean): Html {
  const { name, means } = LABELS[verdict];
  return html`<label class="choice"><input type="radio" name="verdict" value="${verdict}" required${checked ? html` checked` : ''}>
      <span><strong>${name}</strong> <small>${means}</small></span></label>`;
}

function signature({ reviewers, signer }: VerdictSection, chosen: string): Html {
  if (signer !== null) return html`<p>Signed by <strong><bdi>${visible(signer)}</bdi></strong></p>`;
  const label = html`<label for="by">Signed by</label>`;
  if (reviewers.length === 0) {
    return html`${label}
    <input id="by" name="by" required maxlength="${LONGEST_NAME}" autocomplete="name" value="${chosen}">`;
  }
  return html`${label}
    <select id="by" name="by" required>
      <option value="">Choose a name</option>
      ${reviewers.map((name) => html`<option value="${name}"${name === chosen ? html` selected` : ''}>${visible(name)}</option>`)}
    </select>`;
}

/** Side by side: what the reviewer judged and what stands now. The draft waits in the form below, for the new revision. */
export function conflictView(record: EventRecord, { refused }: VerdictSection): Html {
  if (refused === null || refused.judgedRevision === null) return html``;
  const judged = record.history.find((change) => change.revision === refused.judgedRevision);
  const latest = record.verdicts.at(-1);
  return html`<section class="conflict" aria-labelledby="conflict">
    <h2 id="conflict">The event changed while you were judging it</h2>
    <p>Your verdict was not recorded. Compare, then sign again for what stands now, or leave it.</p>
    <div class="two">
      ${view(`What you judged, revision ${refused.judgedRevision}`, judged?.event ?? null)}
      ${view(`What stands now, revision ${record.revision}`, record.event)}
    </div>
    ${latest === undefined ? '' : html`<p>Latest verdict: <strong>${VERDICT_PAST[latest.verdict]}</strong> by <bdi>${visible(latest.by)}</bdi>, ${utc(latest.at)} UTC.${latest.note === '' ? '' : html` <q class="note">${visible(latest.note)}</q>`}</p>`}
  </section>`;
}

function view(heading: string, event: PulsarEvent | null): Html {
  if (event === null) return html`<div><h3>${heading}</h3><p class="empty">Not on record any more.</p></div>`;
  return html`<div><h3>${heading}</h3>
    <dl class="numbers">
      <div><dt>State</dt><dd>${stateText(event.state)}</dd></div>
      <div><dt>Explanation</dt><dd>${event.explanation} <small>${ownProbability(event)}</small></dd></div>
      <div><dt>Epoch</dt><dd>${epochText(event.epochMjd, event.epochInterval68)}</dd></div>
      <div><dt>Size</dt><dd>${sizeText(event)}</dd></div>
      <div><dt>Arrivals used</dt><dd>${event.arrivalsUsed}</dd></div>
    </dl></div>`;
}
