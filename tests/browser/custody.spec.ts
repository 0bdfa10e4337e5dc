import { mkdtemp, readFile, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Page } from '@playwright/test';
import { run, unpack } from '@/tests/support/packages';
import { expect, test } from './support/person';

/** The thread of a sealed recording. */
async function openThread(page: Page, origin: string): Promise<string> {
  await page.goto(`${origin}/ledger?kind=sealed`);
  const number = await page
    .getByRole('link', { name: /^[0-9A-Z]{4}-[0-9A-Z]{4}$/ })
    .first()
    .textContent();
  if (!number) throw new Error('no recording in the ledger');
  await page.goto(`${origin}/ledger/recordings/${number}`);
  await expect(page.getByRole('heading', { name: `Custody of ${number}` })).toBeVisible();
  return number;
}
const panelOf = (page: Page) => page.getByRole('region', { name: 'Verify in this browser' });

test('every check of a thread holds in the reader’s browser, the original’s bytes too', async ({
  as,
  origin,
}) => {
  const page = await as('marguerite');
  await openThread(page, origin);
  const panel = panelOf(page);
  // A head is in storage moments after it was made.
  await expect(async () => {
    await panel.getByRole('button', { name: 'Verify with the original' }).click();
    await expect(panel.getByText('6 of 6')).toBeVisible({ timeout: 6_000 });
  }).toPass({ timeout: 40_000 });
  await expect(page.getByText('Downloaded', { exact: true }).first()).toBeVisible();
});

test('one turned byte of the original fails loudly', async ({ as, origin }) => {
  const page = await as('marguerite');
  await page.route('**/api/ledger/recordings/*/original', async (route) => {
    const answer = await route.fetch();
    const body = await answer.body();
    body[body.length - 1] = (body.at(-1) ?? 0) ^ 1;
    await route.fulfill({ response: answer, body });
  });
  await openThread(page, origin);
  await panelOf(page).getByRole('button', { name: 'Verify with the original' }).click();
  await expect(page.getByRole('alert').filter({ hasText: 'This thread does not verify' })).toBeVisible();
});

test('a head that the reader holds is checked, and a forged one is refused', async ({ as, origin }) => {
  const page = await as('marguerite');
  await openThread(page, origin);
  const heads = (await (await page.request.get(`${origin}/api/ledger/heads`)).json()) as {
    rows: { note: string }[];
  };
  const held = heads.rows.at(-1)?.note ?? '';
  const panel = panelOf(page);
  const check = async (text: string) => {
    await panel.getByRole('button', { name: 'Check against a head I hold…' }).click();
    const dialog = page.getByRole('dialog');
    await dialog.getByLabel('The head', { exact: true }).fill(text);
    await dialog.getByRole('button', { name: 'Check against it' }).click();
  };
  await check(held);
  await expect(panel.getByText('The head you hold is of this very log.')).toBeVisible();
  await check(held.replace(/\n(\d+)\n/, (_, size: string) => `\n${Number(size) + 1}\n`));
  await expect(page.getByRole('alert').filter({ hasText: 'does not verify' })).toBeVisible();
});

test('two heads are chosen, and one is shown to follow the other', async ({ as, origin }) => {
  const page = await as('marguerite');
  await page.goto(`${origin}/ledger`);
  await page.getByRole('link', { name: 'Tree heads' }).click();
  const boxes = page.getByRole('checkbox', { name: /^Select the head of/ });
  await boxes.nth(0).check();
  await boxes.nth(3).check();
  await page.getByRole('button', { name: 'Check that one follows the other' }).click();
  await expect(page.getByText('One follows the other', { exact: true })).toBeVisible();
});

test('an evidence package is taken away with a reason, and verifies on its own', async ({ as, origin }) => {
  const page = await as('marguerite');
  const number = await openThread(page, origin);
  await page.getByRole('button', { name: 'Make an evidence package…' }).click();
  const dialog = page.getByRole('dialog');
  await dialog.getByLabel(/^Why it is taken/).fill('For the coroner, case 7');
  const [download] = await Promise.all([
    page.waitForEvent('download'),
    dialog.getByRole('button', { name: 'Make the package' }).click(),
  ]);
  expect(download.suggestedFilename()).toBe(`evidence-${number}.zip`);
  const folder = await mkdtemp(join(tmpdir(), 'bellkeep-taken-'));
  const archive = join(folder, 'package.zip');
  await download.saveAs(archive);
  await unpack(await readFile(archive), folder);
  const verifier = join(folder, `evidence-${number}`, 'verify.mjs');
  const { code, output } = await run(process.execPath, [verifier, archive], folder);
  expect(code, output).toBe(0);
  await rm(folder, { recursive: true });
  await expect(page.getByRole('region', { name: 'Evidence packages' })).toContainText('For the coroner');
});
