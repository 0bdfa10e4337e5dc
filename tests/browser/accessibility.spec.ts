import AxeBuilder from '@axe-core/playwright';
import type { Page } from '@playwright/test';
import { expect, house, test } from './support/person';

const PAGES: Record<string, string[]> = {
  ines: [
    '/bench',
    '/bench/add',
    '/bench/models',
    '/devices/HM-0301',
    '/devices/HM-0521/sheet',
    '/ledger',
    '/account',
  ],
  solveig: [
    '/bedside',
    '/bedside/tray',
    '/bedside/recordings',
    '/bedside/sessions/new',
    'recording',
    'thread',
    'encounter',
    'session',
  ],
  tomasz: [
    '/keyroom',
    '/keyroom/rotations',
    '/keyroom/keys',
    '/keyroom/people',
    '/keyroom/people/invitations',
    '/keyroom/policies',
    '/keyroom/policies/credentials',
    '/keyroom/connections',
    '/keyroom/clients',
    '/keyroom/webhooks',
    '/keyroom/health',
    '/account',
    '/device-api',
    '/problems',
  ],
  marguerite: ['/ledger', '/ledger?q=HM-0301', '/ledger/heads'],
};

/** Places whose address is only known from what is there. */
async function addressOf(page: Page, path: string): Promise<string> {
  const origin = house().origin;
  if (path.startsWith('/')) return origin + path;
  const json = async (address: string) => (await page.request.get(origin + address)).json();
  const encounters = await json('/api/encounters?limit=100');
  const recordings = await json('/api/recordings?limit=1');
  const number = recordings.rows[0]?.number;
  if (path === 'recording') return `${origin}/recordings/${number}`;
  if (path === 'thread') return `${origin}/ledger/recordings/${number}`;
  if (path === 'encounter') return `${origin}/encounters/${encounters.rows[0].id}`;
  const open = encounters.rows.find((row: { session: { id: string } | null }) => row.session);
  if (open) return `${origin}/bedside/sessions/${open.session.id}`;
  await page.goto(`${origin}/encounters/${recordings.rows[0].encounterId}`);
  return (
    origin +
    (await page
      .getByRole('link', { name: /^S-\d+$/ })
      .first()
      .getAttribute('href'))
  );
}

async function check(page: Page, address: string): Promise<void> {
  for (const theme of ['light', 'dark'] as const) {
    await page.emulateMedia({ colorScheme: theme, reducedMotion: 'reduce' });
    for (const width of [1440, 390]) {
      await page.setViewportSize({ width, height: 900 });
      await page.goto(address);
      await page.getByRole('heading', { level: 1 }).first().waitFor();
      const { violations } = await new AxeBuilder({ page })
        .withTags(['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'])
        .analyze();
      expect(
        violations.map(
          ({ id, nodes }) =>
            `${id}: ${nodes
              .map((node) => node.target.join(' '))
              .slice(0, 3)
              .join(', ')}`,
        ),
        `${address} ${theme} ${width}`,
      ).toEqual([]);
      const overflow = await page.evaluate(
        () => document.documentElement.scrollWidth - document.documentElement.clientWidth,
      );
      expect(overflow, `${address} runs past its sides at ${width}`).toBeLessThanOrEqual(0);
    }
  }
}

for (const [who, paths] of Object.entries(PAGES)) {
  test(`every page of ${who} can be used by everybody, day and night`, async ({ as }) => {
    test.setTimeout(600_000);
    const page = await as(who);
    for (const path of paths) await check(page, await addressOf(page, path));
  });
}

test('pages before signing in can be used by everybody', async ({ page, origin }) => {
  for (const path of ['/sign-in', '/forgot', '/reset/none', '/problems/bytes-mismatch', '/nowhere']) {
    await page.goto(origin + path);
    const { violations } = await new AxeBuilder({ page }).analyze();
    expect(
      violations.map(({ id }) => id),
      path,
    ).toEqual([]);
  }
});

test('scripts run only with the page’s own nonce, and nobody frames a page', async ({ page, origin }) => {
  const response = await page.goto(`${origin}/sign-in`);
  const policy = response?.headers()['content-security-policy'] ?? '';
  expect(policy).toMatch(/script-src 'self' 'nonce-[A-Za-z0-9+/=]+' 'strict-dynamic'(;|$)/);
  expect(policy).toContain("frame-ancestors 'none'");
  expect(response?.headers()['x-content-type-options']).toBe('nosniff');
});
