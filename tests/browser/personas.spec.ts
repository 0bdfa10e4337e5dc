import { enrol } from '@/devices/agent/enrol';
import { heartbeat } from '@/devices/agent/heartbeat';
import { sendRecording } from '@/devices/agent/upload';
import { CLEAN, synthesise } from '@/devices/synth/chest';
import { encodeWav } from '@/devices/synth/wav';
import { expect, test } from './support/person';

const wav = (seed: number, faults = {}) =>
  encodeWav([synthesise({ ...CLEAN, seconds: 12, sampleRateHz: 4000, faults }, seed)], {
    sampleRateHz: 4000,
    bitDepth: 16,
  });
const clip = (n: string, bytes: Uint8Array, site?: string) => ({
  recordingNumber: n,
  bytes,
  mediaType: 'audio/wav',
  recordedAt: Date.now(),
  ...(site ? { site: site as 'back-upper-right' } : {}),
});

test.describe.configure({ mode: 'serial' });

test('from the bench to the bedside: a device is added, enrols, and its clip is heard and filed live', async ({
  as,
  origin,
  newDevice,
}) => {
  // Bench: add the device, make its sheet.
  const bench = await as('ines');
  await bench.goto(`${origin}/bench/add`);
  await bench.getByLabel('Asset tag').fill('HM-7001');
  await bench.getByLabel('Serial number').fill('TW2-TEST-7001');
  await bench.getByLabel('Model').selectOption({ label: 'Tarn & Wick TW-2' });
  await bench.getByLabel('Ward').selectOption({ label: 'Alder' });
  await bench.getByRole('button', { name: /Add the device/ }).click();
  await bench.waitForURL(/\/sheet$/);
  await bench.getByRole('button', { name: 'Make the code' }).click();
  const code = await bench.locator('[data-code]').getAttribute('data-code');
  const device = await newDevice('TW2-TEST-7001');
  await enrol(device, code ?? '');
  await bench.goto(`${origin}/devices/HM-7001`);
  await expect(bench.getByRole('heading', { level: 1, name: 'HM-7001' })).toBeVisible();
  await expect(bench.getByText('bound to its key').first()).toBeVisible();

  // Bedside: open a session with it.
  const ward = await as('solveig');
  await ward.goto(`${origin}/bedside/sessions/new`);
  await ward.getByRole('list', { name: 'Encounters' }).getByRole('radio').first().click();
  await ward.getByLabel('Stethoscope', { exact: true }).fill('HM-7001');
  await ward.getByRole('button', { name: /^Open the session/ }).click();
  await ward.waitForURL(/\/bedside\/sessions\/[\w-]+$/);
  await expect(ward.getByText('Waiting for the first clip')).toBeVisible();

  // The verdict arrives without a reload.
  await sendRecording(device, clip('b-1', wav(41), 'back-upper-right'));
  await expect(ward.getByText('no technical fault found')).toBeVisible();
  const loud = await sendRecording(device, clip('b-2', wav(42, { clipGain: 30 }), 'back-upper-left'));
  await expect(ward.getByRole('button', { name: 'Keep anyway…' })).toBeVisible();
  await expect(ward.getByText(/cut off at the top/)).toBeVisible();

  // Keep it, with a reason.
  await ward.getByRole('button', { name: 'Keep anyway…' }).click();
  await ward.getByLabel('Why it is kept').fill('The child would not allow a second try');
  await ward.getByRole('button', { name: 'Keep the clip' }).click();
  await expect(ward.getByText('Kept anyway').first()).toBeVisible();

  // Look at the recording and play it.
  await ward.goto(`${origin}/recordings/${loud.answer.recording}`);
  await expect(ward.getByRole('heading', { name: `Recording ${loud.answer.recording}` })).toBeVisible();
  await expect(ward.getByRole('table').getByText('Clipped')).toBeVisible();
  await ward.getByRole('button', { name: 'Play' }).click();
  await expect(ward.getByRole('button', { name: /Pause|Stop/ })).toBeVisible();

  // Its thread says who heard it.
  await ward.goto(`${origin}/ledger/recordings/${loud.answer.recording}`);
  await expect(ward.getByText('Heard').first()).toBeVisible();
  await expect(ward.getByText('Kept anyway').first()).toBeVisible();
});

test('a stray clip is filed from the tray in three interactions, after two identifiers are read', async ({
  as,
  origin,
  newDevice,
}) => {
  const bench = await as('ines');
  await bench.goto(`${origin}/devices/HM-7001/sheet`);
  await bench.getByRole('button', { name: 'Make the code' }).click();
  const code = await bench.locator('[data-code]').getAttribute('data-code');
  const device = await newDevice('TW2-TEST-7001');
  await enrol(device, code ?? '');
  const ward = await as('solveig');
  // End the session of before: the next clip is a stray one.
  await ward.goto(`${origin}/bedside`);
  await ward.getByRole('link', { name: /with HM-7001/ }).click();
  await ward.getByRole('button', { name: 'End session' }).click();
  await ward.getByRole('button', { name: 'End the session' }).click();
  await expect(ward.getByRole('button', { name: 'End session' })).toBeHidden();
  await expect(ward.getByText(/was with this patient/)).toBeVisible();
  const { answer } = await sendRecording(device, clip('stray-1', wav(43)));
  await ward.goto(`${origin}/bedside/tray`);
  const row = ward.getByRole('article', { name: `Clip ${answer.recording}` });
  await expect(row).toContainText('with this device');
  // The wristband's text, as the person reads it: taken from the encounter's own page here.
  const candidate = await row
    .getByRole('list', { name: 'Where it may belong' })
    .getByRole('listitem')
    .first()
    .textContent();
  const number = /E-\d+/.exec(candidate ?? '')?.[0] ?? '';
  const who = await (await ward.request.get(`${origin}/api/encounters?q=${number}`)).json();
  await row.getByRole('button', { name: /^File/ }).first().click();
  const dialog = ward.getByRole('dialog');
  await dialog.getByLabel('Record number').fill('HGH-000-0000');
  await dialog.getByLabel('Date of birth or family name').fill('Nobody');
  await dialog.getByRole('button', { name: /^File to/ }).click();
  await expect(dialog.getByRole('alert')).toBeVisible();
  await dialog.getByLabel('Record number').fill(who.rows[0].recordNumber);
  await dialog.getByLabel('Date of birth or family name').fill(who.rows[0].familyName);
  await dialog.getByRole('button', { name: /^File to/ }).click();
  await expect(dialog).toBeHidden();
  await expect(ward.getByRole('link', { name: answer.recording })).toBeHidden();
});

test('the key room rotates one credential, and the device renews by itself', async ({
  as,
  origin,
  newDevice,
}) => {
  const bench = await as('ines');
  await bench.goto(`${origin}/devices/HM-7001/sheet`);
  await bench.getByRole('button', { name: 'Make the code' }).click();
  const code = await bench.locator('[data-code]').getAttribute('data-code');
  const device = await newDevice('TW2-TEST-7001');
  await enrol(device, code ?? '');
  await heartbeat(device);
  const before = device.credential?.credentialId;
  const keys = await as('tomasz');
  await keys.goto(`${origin}/keyroom?q=HM-7001`);
  await keys.getByRole('button', { name: 'Rotate the credential of HM-7001' }).click();
  await keys.getByRole('button', { name: 'Rotate the credential', exact: true }).click();
  await expect(keys.getByText(/Asked to renew/).first()).toBeVisible();
  await heartbeat(device);
  expect(device.credential?.credentialId).not.toBe(before);
  await heartbeat(device);
  await expect(keys.getByText(device.credential?.credentialId ?? '')).toBeVisible();
});

test('the auditor goes from a recording number to its checked thread in two interactions', async ({
  as,
  origin,
}) => {
  const ledger = await as('marguerite');
  await ledger.goto(`${origin}/ledger?kind=sealed`);
  const number = await ledger
    .getByRole('link', { name: /^[0-9A-Z]{4}-[0-9A-Z]{4}$/ })
    .first()
    .textContent();
  if (!number) throw new Error('no recording in the ledger');
  await ledger.goto(`${origin}/ledger`);
  await ledger.getByRole('searchbox').fill(number);
  await ledger.getByRole('list', { name: 'Threads' }).getByRole('link', { name: number }).click();
  await expect(ledger.getByRole('heading', { name: `Custody of ${number}` })).toBeVisible();
  const verify = ledger.getByRole('region', { name: 'Verify in this browser' });
  await expect(verify.getByRole('listitem').filter({ hasText: 'Every entry hashes' })).toContainText('right');
  await expect(ledger.getByText('Sealed', { exact: true }).first()).toBeVisible();
});

test('what one may not see and what does not exist look alike', async ({ as, origin }) => {
  const bench = await as('ines');
  for (const path of ['/keyroom', '/recordings/XXXX-XXXX', '/bedside', '/devices/none']) {
    await bench.goto(origin + path);
    await expect(
      bench.getByRole('heading', { name: 'There is nothing here that you may see' }),
    ).toBeVisible();
  }
});
