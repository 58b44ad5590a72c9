import type { Browser, BrowserContext, BrowserContextOptions, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach } from 'vitest';
import { launchBrowser } from './browser.ts';

export const DESK = { width: 1280, height: 800 };

export interface BrowserPages {
  /** Notes every console message above `log`, every script error and every host asked. */
  open(options?: BrowserContextOptions): Promise<Page>;
  readonly complaints: string[];
  readonly hosts: Set<string>;
}

/** One browser for the tests of a block; the pages of each test end with it: an open page goes on asking, also after its server has gone. */
export function browserPages(): BrowserPages {
  let browser: Browser;
  let contexts: BrowserContext[] = [];
  const complaints: string[] = [];
  const hosts = new Set<string>();
  beforeAll(async () => {
    browser = await launchBrowser();
  });
  afterAll(() => browser.close());
  beforeEach(() => {
    complaints.length = 0;
    hosts.clear();
  });
  afterEach(async () => {
    await Promise.all(contexts.splice(0).map((context) => context.close()));
  });
  return {
    complaints,
    hosts,
    async open(options = { viewport: DESK }) {
      const context = await browser.newContext(options);
      contexts = [...contexts, context];
      const page = await context.newPage();
      page.on('console', (message) => {
        if (['error', 'warning'].includes(message.type())) complaints.push(message.text());
      });
      page.on('pageerror', (error) => complaints.push(String(error)));
      page.on('request', (request) => hosts.add(new URL(request.url()).host));
      return page;
    },
  };
}
