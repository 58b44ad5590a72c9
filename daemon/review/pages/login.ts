import { html } from 'hono/html';
import { LONGEST_NAME } from '../verdictForm.ts';
import { type Html, plainDocument } from './layout.ts';
import { visible } from './wording.ts';

/** The pages of coming in and going out. */

export interface LoginForm {
  readonly token: string;
  /** Where to go afterwards. */
  readonly next: string;
  readonly name: string;
  /** Why the last try failed; null: there was none. */
  readonly refused: string | null;
}

export function loginPage(observatory: string, form: LoginForm): Html {
  return plainDocument(
    'Log in',
    html`<h1>${visible(observatory)}</h1>
      <form class="verdict" method="post" action="/login" accept-charset="utf-8">
        <h2>Log in as reviewer</h2>
        ${form.refused === null ? '' : html`<p class="refused" role="alert">${form.refused}</p>`}
        <input type="hidden" name="token" value="${form.token}">
        <input type="hidden" name="next" value="${form.next}">
        <label for="name">Name</label>
        <input id="name" name="name" required maxlength="${LONGEST_NAME}" autocomplete="username" value="${form.name}">
        <label for="password">Password</label>
        <input id="password" name="password" type="password" required autocomplete="current-password">
        <button type="submit">Log in</button>
        <p class="quiet">Passwords are set on the machine of the watch: <code>spinvigil reviewer NAME</code></p>
      </form>`,
  );
}

export function accountPage(reviewer: string, token: string): Html {
  return html`<h1>Account</h1>
    <p>You are logged in as <strong><bdi>${visible(reviewer)}</bdi></strong>. Your verdicts are signed with this name.</p>
    <form class="verdict" method="post" action="/logout">
      <input type="hidden" name="token" value="${token}">
      <button type="submit">Log out</button>
    </form>`;
}

/** A verdict that came when nobody was logged in any more: nothing is recorded, and what was typed is handed back. */
export function lateVerdictPage(note: string, next: string): Html {
  return plainDocument(
    'Log in, then sign again',
    html`<h1>You are not logged in any more</h1>
      <p>Nothing was recorded. Log in, then sign again.</p>
      ${
        note === ''
          ? ''
          : html`<label for="kept">Your note, to be copied</label><textarea id="kept" rows="8" readonly>
${note}</textarea>`
      }
      <p><a href="/login?next=${encodeURIComponent(next)}">Log in</a></p>`,
  );
}

/** Opened from another site a page does not get its cookie; asked for once more by itself it does. */
export function onceMorePage(path: string): Html {
  return plainDocument(
    'One moment',
    html`<p><a href="${path}">Open the page</a></p>`,
    html`<meta http-equiv="refresh" content="0; url=${path}">`,
  );
}
