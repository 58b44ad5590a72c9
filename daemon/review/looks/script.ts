import { CHART_SCRIPT } from './chartScript.ts';
import { KEY_SCRIPT } from './keyScript.ts';
import { LIST_SCRIPT } from './listScript.ts';
import { LIVE_SCRIPT } from './liveScript.ts';

/** All that runs in the page, in one file that is our own. Everything works without it. */
export const SCRIPT = `'use strict';
(() => {${LIVE_SCRIPT}${KEY_SCRIPT}${LIST_SCRIPT}${CHART_SCRIPT}})();
`;
