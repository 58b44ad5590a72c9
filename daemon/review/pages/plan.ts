import { html } from 'hono/html';
import { planOfEvent } from '../../../alerts/wording/plan.ts';
import type { EventPlan } from '../../../detectors/index.ts';
import type { PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { Html } from './layout.ts';
import { mjdAndDay, visible } from './wording.ts';

/** When to observe next, and what each night would settle of this event: the command's words, as of the last arrival. */
export function planSection(event: PulsarEvent, plan: EventPlan | null): Html {
  if (event.state === 'rejected' || event.state === 'withdrawn' || event.site !== null) return html``;
  const statements = plan === null ? [] : planOfEvent(plan, event.id, 'UTC');
  const [mjd, day] = plan === null ? ['', ''] : mjdAndDay(plan.asOfMjd);
  const command = html`<code>spinvigil plan "${visible(event.pulsar)}"</code>`;
  return html`<section class="plan" aria-labelledby="plan"><h2 id="plan">What more observations would settle</h2>
    ${
      plan === null || statements.length === 0
        ? html`<p class="empty">Nothing is open here. What other nights and cadences would show: ${command}</p>`
        : html`<p class="quiet">As of the last arrival, ${mjd} (${day}). As of now: ${command}</p>`
    }
    ${statements.map(
      ({ says, lines }) => html`<p>${visible(says)}</p>
        ${lines.length === 0 ? '' : html`<ul class="todo">${lines.map((line) => html`<li>${visible(line)}</li>`)}</ul>`}`,
    )}</section>`;
}
