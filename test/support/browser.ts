import { existsSync } from 'node:fs';
import { type Browser, chromium } from 'playwright-core';

const CHROMIUM = '/usr/bin/chromium';

/** Whether a browser is installed; says so loudly when not, so that a skipped test is seen. */
export function hasBrowser(): boolean {
  if (existsSync(CHROMIUM)) return true;
  console.warn(`SKIPPED: no browser at ${CHROMIUM}; the review page is not tried in one (Debian package: chromium).`);
  return false;
}

/** Headless, and quiet: a browser that phones home would spoil the test that nothing leaves this machine. */
export function launchBrowser(): Promise<Browser> {
  return chromium.launch({
    executablePath: CHROMIUM,
    args: [
      '--headless',
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  });
}
