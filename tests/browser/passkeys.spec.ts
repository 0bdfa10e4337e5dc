import type { Page } from '@playwright/test';
import { expect, house, test } from './support/person';

/** An authenticator inside the browser, whose holder always agrees (Chrome DevTools Protocol, WebAuthn domain). */
async function withAuthenticator(page: Page): Promise<void> {
  const devtools = await page.context().newCDPSession(page);
  await devtools.send('WebAuthn.enable');
  await devtools.send('WebAuthn.addVirtualAuthenticator', {
    options: {
      protocol: 'ctap2',
      transport: 'internal',
      hasResidentKey: true,
      hasUserVerification: true,
      isUserVerified: true,
      automaticPresenceSimulation: true,
    },
  });
}

test('a passkey is added on the account page, signs in alone and after the password, and is removed', async ({
  browser,
}) => {
  const { origin, signIns } = house();
  const context = await browser.newContext();
  const page = await context.newPage();
  await withAuthenticator(page);
  const password = signIns.ines ?? '';
  const signInByPassword = async () => {
    await page.goto(`${origin}/sign-in`);
    await page.getByLabel('E-mail').fill('ines@harrowmere.example');
    await page.getByLabel('Password').fill(password);
    await page.getByRole('button', { name: 'Sign in', exact: true }).click();
  };
  const signOut = () => context.clearCookies();

  await signInByPassword();
  await page.waitForURL(/\/bench/);
  await page.goto(`${origin}/account`);
  await page.getByRole('button', { name: 'Add a passkey' }).click();
  await page.getByLabel('Name', { exact: true }).fill('Bench computer');
  await page.locator('form').getByLabel('Your password').last().fill(password);
  await page.getByRole('button', { name: 'Make the passkey' }).click();
  await expect(page.getByRole('button', { name: 'Remove the passkey Bench computer' })).toBeVisible();

  await signOut();
  await page.goto(`${origin}/sign-in`);
  await page.getByRole('button', { name: 'Use a passkey' }).click();
  await page.waitForURL(/\/bench/);

  await signOut();
  await signInByPassword();
  await expect(page.getByRole('heading', { name: 'Passkey' })).toBeVisible();
  expect((await context.cookies()).filter(({ name }) => name.includes('session_token'))).toEqual([]);
  await page.getByRole('button', { name: 'Show the passkey' }).click();
  await page.waitForURL(/\/bench/);

  await page.goto(`${origin}/account`);
  await page.getByRole('button', { name: 'Remove the passkey Bench computer' }).click();
  await page.locator('form').getByLabel('Your password').last().fill(password);
  await page.getByRole('button', { name: 'Remove the passkey', exact: true }).click();
  await expect(page.getByRole('button', { name: 'Remove the passkey Bench computer' })).toBeHidden();

  await signOut();
  await signInByPassword();
  await page.waitForURL(/\/bench/);
  await context.close();
});
