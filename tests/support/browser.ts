import { AxeBuilder } from '@axe-core/playwright';
import { expect, type Page, test as base } from '@playwright/test';

import type { Role } from '#schemas/people.ts';

import { DEMO_PASSWORD } from './browser-server.ts';

export { expect } from '@playwright/test';

/** Messages of the browser or of three.js that say nothing about our code. */
const HARMLESS = [/GPU stall due to ReadPixels/, /THREE\.Clock: This module has been deprecated/, /Automatic fallback to software WebGL/];

interface Fixtures {
  /** Signs the page's browser context in as the demo team's person with that role. */
  signInAs(role: Role): Promise<void>;
  /** Console errors, warnings of the page's security policy and uncaught errors so far; not empty at the end fails the test. */
  problems: string[];
}

/** Playwright's `test` with sign-in by fixture; a test also fails when the page logs an error. */
export const test = base.extend<Fixtures>({
  signInAs: async ({ page, baseURL }, use) => {
    await use(async (role) => {
      const answer = await page.request.post('/api/v1/session', {
        data: { email: `${role}@selvage.example`, password: DEMO_PASSWORD },
        headers: { origin: baseURL ?? '' },
      });
      expect(answer.ok(), `sign-in as ${role}: ${answer.status()} ${await answer.text()}`).toBe(true);
    });
  },
  problems: [
    async ({ page }, use) => {
      const problems: string[] = [];
      page.on('console', (message) => {
        if (message.type() === 'error' && !HARMLESS.some((pattern) => pattern.test(message.text()))) problems.push(message.text());
      });
      page.on('pageerror', (error) => problems.push(String(error.stack ?? error)));
      await use(problems);
      expect(problems, 'the page logged errors').toEqual([]);
    },
    { auto: true },
  ],
});

/** Puts the page into a theme, as the theme switch does. */
export async function setTheme(page: Page, theme: 'light' | 'dark'): Promise<void> {
  await page.emulateMedia({ colorScheme: theme });
  await page.evaluate((name) => (document.documentElement.dataset['theme'] = name), theme);
}

/** Runs axe in both themes and expects no violation of WCAG 2.2 A and AA or of its best practices. */
export async function expectAccessible(page: Page): Promise<void> {
  for (const theme of ['light', 'dark'] as const) {
    await setTheme(page, theme);
    const result = await new AxeBuilder({ page }).withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice']).analyze();
    const found = result.violations.map((one) => `${theme}: ${one.id}: ${one.help}: ${one.nodes.map((node) => node.target.join(' ')).slice(0, 5).join(' | ')}`);
    expect(found).toEqual([]);
  }
}
