import { defineConfig } from '@playwright/test';

export default defineConfig({
  testDir: 'tests/browser',
  // One house, one browser at a time: two cores.
  workers: 1,
  timeout: 90_000,
  expect: { timeout: 15_000 },
  outputDir: 'test-results/browser',
  reporter: [['list'], ['json']],
  globalSetup: './tests/browser/support/house.ts',
  use: {
    launchOptions: {
      executablePath: '/usr/bin/chromium',
      args: [
        '--no-sandbox',
        '--disable-gpu',
        '--disable-quic',
        '--no-first-run',
        '--disable-background-networking',
        '--disable-component-update',
        '--disable-sync',
        '--autoplay-policy=no-user-gesture-required',
      ],
    },
    viewport: { width: 1440, height: 900 },
    trace: 'off',
  },
});
