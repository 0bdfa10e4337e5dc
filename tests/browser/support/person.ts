import { createHmac } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { type Browser, type BrowserContext, test as base, expect, type Page } from '@playwright/test';
import { createDevice, type Device } from '@/devices/agent/device';
import { HOUSE_FILE, type RunningHouse } from './house';

export { expect } from '@playwright/test';

const BASE32 = 'ABCDEFGHIJKLMNOPQRSTUVWXYZ234567';

/** RFC 6238 with SHA-1, 30 s and six digits. */
export function totp(secret: string, atMs = Date.now()): string {
  const bits = [...secret].map((char) => BASE32.indexOf(char).toString(2).padStart(5, '0')).join('');
  const key = Buffer.from((bits.match(/.{8}/g) ?? []).map((byte) => Number.parseInt(byte, 2)));
  const counter = Buffer.alloc(8);
  counter.writeBigUInt64BE(BigInt(Math.floor(atMs / 30_000)));
  const hash = createHmac('sha1', key).update(counter).digest();
  return String((hash.readUInt32BE((hash[19] ?? 0) & 15) & 0x7fffffff) % 1_000_000).padStart(6, '0');
}

export const house = (): RunningHouse => JSON.parse(readFileSync(HOUSE_FILE, 'utf8')) as RunningHouse;

/** Errors that a page wrote to its console: any of them fails the test that opened it. */
const complaints = new WeakMap<Page, string[]>();
function listenTo(page: Page): void {
  const said: string[] = [];
  complaints.set(page, said);
  page.on('pageerror', (error) => said.push(error.message));
  page.on('console', (message) => {
    // What a page asks for and is refused shows here too; tests that mean it look at the page.
    if (
      message.type() === 'error' &&
      !/Failed to load resource|ERR_INCOMPLETE_CHUNKED|ERR_NETWORK_CHANGED|ERR_CONNECTION/.test(
        message.text(),
      )
    )
      said.push(message.text());
  });
}

export async function signIn(page: Page, who: string): Promise<void> {
  const { origin, signIns, authenticatorKey } = house();
  await page.goto(`${origin}/sign-in`);
  await page.getByLabel('E-mail').fill(`${who}@harrowmere.example`);
  await page.getByLabel('Password').fill(signIns[who] ?? '');
  await page.getByRole('button', { name: 'Sign in' }).click();
  if (who === 'tomasz') {
    await page.getByLabel('Code', { exact: true }).fill(totp(authenticatorKey));
    await page.getByRole('button', { name: /Go on|Sign in/ }).click();
  }
  await page.waitForURL((url) => !url.pathname.startsWith('/sign-in'));
}

/** Signing in once for a whole file: a code of the authenticator works only once in its half minute. */
const remembered = new Map<string, Awaited<ReturnType<BrowserContext['storageState']>>>();
async function contextOf(browser: Browser, who: string): Promise<BrowserContext> {
  const before = remembered.get(who);
  const context = await browser.newContext({
    viewport: { width: 1440, height: 900 },
    ...(before ? { storageState: before } : {}),
  });
  // A test may have ended the sessions of somebody: a passkey that is taken away ends all others.
  if (before && (await context.request.get(`${house().origin}/api/me`)).ok()) return context;
  await context.clearCookies();
  const page = await context.newPage();
  await signIn(page, who);
  await page.close();
  remembered.set(who, await context.storageState());
  return context;
}

interface Fixtures {
  /** A page on which this person is signed in. */
  as: (who: string) => Promise<Page>;
  origin: string;
  /** A device of the real kind, not enrolled yet. */
  newDevice: (serialNumber: string) => Promise<Device>;
}

export const test = base.extend<Fixtures>({
  origin: async ({ browserName: _name }, use) => use(house().origin),
  as: async ({ browser }, use) => {
    const contexts: BrowserContext[] = [];
    const pages: Page[] = [];
    await use(async (who) => {
      const context = await contextOf(browser, who);
      contexts.push(context);
      const page = await context.newPage();
      listenTo(page);
      pages.push(page);
      return page;
    });
    for (const page of pages) expect(complaints.get(page), 'errors on the page').toEqual([]);
    for (const context of contexts) await context.close();
  },
  newDevice: async ({ origin }, use) =>
    use((serialNumber) => createDevice({ origin, serialNumber, stateFolder: null })),
});
