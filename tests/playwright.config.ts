import { defineConfig } from '@playwright/test';

export default defineConfig({
  testDir: './browser',
  testMatch: process.env['SELVAGE_NIGHTLY'] === '1' ? /\.test\.ts$/ : /(?<!\.nightly)\.test\.ts$/,
  outputDir: '../test-results/browser',
  globalSetup: './support/browser-server.ts',
  // Two processors: the server, its worker and one browser keep them busy.
  workers: 1,
  fullyParallel: false,
  timeout: 60_000,
  expect: { timeout: 10_000 },
  retries: 0,
  forbidOnly: true,
  reporter: process.env['PLAYWRIGHT_JSON_OUTPUT_NAME'] === undefined ? [['list']] : [['list'], ['json']],
  use: {
    baseURL: process.env['SELVAGE_TEST_URL'],
    viewport: { width: 1440, height: 900 },
    locale: 'en-GB',
    timezoneId: 'UTC',
    colorScheme: 'light',
    trace: 'retain-on-failure',
    screenshot: 'only-on-failure',
    launchOptions: {
      executablePath: process.env['SELVAGE_CHROMIUM'] ?? '/usr/bin/chromium',
      chromiumSandbox: false,
      args: ['--disable-dev-shm-usage', '--font-render-hinting=none'],
    },
  },
});
