import { createHash } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { derivedObject, recording } from '@/db/schema';
import { sendRecording } from '@/devices/agent/upload';
import { decodePeaks } from '@/lib/acoustics/pictures/peaks';
import { decodeSpectrogram } from '@/lib/acoustics/pictures/spectrogram';
import { hex, leafHash } from '@/lib/custody/pure/hash';
import { readThread } from '@/lib/custody/readThread';
import { openSession } from '@/lib/filing/openSession';
import { chestWav, clean, clipOf, openPassageHouse, type PassageHouse } from '../support/passageHouse';

let house: PassageHouse;
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(() => house.close());

const rowOf = async (number: string) => {
  const [row] = await house.services.read.select().from(recording).where(eq(recording.number, number));
  if (!row) throw new Error('no such recording');
  return row;
};

test('a clip recorded in a listening session is judged and filed to its encounter, and its thread tells each step', async () => {
  const place = await house.encounter();
  const person = await house.clinician(place.wardId);
  const { agent, assetTag } = await house.enrolled();
  await openSession(house.services, person, { encounterId: place.id, device: assetTag, takeOver: false });
  const bytes = chestWav();
  const { answer } = await sendRecording(agent, clipOf(bytes, { site: 'back-lower-right' }));
  expect(answer).toMatchObject({
    stage: 'filed',
    verdict: 'usable',
    filing: { encounter: place.number, by: 'session' },
    durationSeconds: 12,
  });
  expect(answer.sha256).toBe(createHash('sha256').update(bytes).digest('hex'));

  const row = await rowOf(answer.recording);
  const { rows } = await readThread(house.services, { kind: 'recording', id: row.id });
  expect(rows.map((entry) => entry.kind).reverse()).toEqual([
    'slot-issued',
    'received',
    'sealed',
    'measured',
    'filed',
  ]);
  expect(answer.custodyEntries).toBe(5);
  for (const entry of rows)
    expect(hex(await leafHash(new TextEncoder().encode(entry.canonical)))).toBe(entry.leafHash);
});

test('the sealed original is byte for byte what the device sent, locked, and the incoming copy is gone', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 2);
  const { answer } = await sendRecording(agent, clipOf(bytes));
  const row = await rowOf(answer.recording);
  expect(
    Buffer.from(await house.services.storage.getBytes(row.originalKey ?? '', 1e7)).equals(Buffer.from(bytes)),
  ).toBe(true);
  expect(await house.services.storage.head(row.slotKey)).toBeNull();
  const head = await house.services.storage.head(row.originalKey ?? '');
  expect(head?.retainUntilMs).toBeGreaterThan(Date.now() + 7 * 365 * 86_400_000);
  await expect(house.services.storage.remove(row.originalKey ?? '')).rejects.toMatchObject({
    code: 'locked',
  });
});

test('waveform and spectrogram are stored with the hash of their input and their own', async () => {
  const { agent } = await house.enrolled();
  const { answer } = await sendRecording(agent, clipOf(chestWav(clean(), 3)));
  const row = await rowOf(answer.recording);
  const pictures = await house.services.read
    .select()
    .from(derivedObject)
    .where(eq(derivedObject.recordingId, row.id));
  expect(pictures.map((picture) => picture.kind).sort()).toEqual(['peaks', 'spectrogram']);
  for (const picture of pictures) {
    const bytes = await house.services.storage.getBytes(picture.key, 1e7);
    expect(createHash('sha256').update(bytes).digest('hex')).toBe(picture.sha256);
    expect(picture.inputSha256).toBe(answer.sha256);
    if (picture.kind === 'peaks') expect(decodePeaks(bytes).frames).toBe(48_000);
    else expect(decodeSpectrogram(bytes).binHz).toBeCloseTo(15.625, 3);
  }
});

test('a clip without session or identifier goes to the tray', async () => {
  const { agent } = await house.enrolled();
  const { answer } = await sendRecording(agent, clipOf(chestWav(clean(), 4)));
  expect(answer).toMatchObject({ stage: 'measured', filing: null });
});

test('a scanned wristband files the clip to the one running encounter, and an unknown one sends it to the tray', async () => {
  const place = await house.encounter();
  const { agent } = await house.enrolled();
  const known = await sendRecording(
    agent,
    clipOf(chestWav(clean(), 5), { scannedIdentifier: place.recordNumber }),
  );
  expect(known.answer.filing).toEqual({ encounter: place.number, by: 'identifier' });
  const unknown = await sendRecording(
    agent,
    clipOf(chestWav(clean(), 6), { scannedIdentifier: 'HGH-000-0000' }),
  );
  expect(unknown.answer.filing).toBeNull();
});

test('a wristband that contradicts the open session sends the clip to the tray, not to either patient', async () => {
  const [here, there] = [await house.encounter(), await house.encounter()];
  const person = await house.clinician(here.wardId);
  const { agent, assetTag } = await house.enrolled();
  await openSession(house.services, person, { encounterId: here.id, device: assetTag, takeOver: false });
  const { answer } = await sendRecording(
    agent,
    clipOf(chestWav(clean(), 7), { scannedIdentifier: there.recordNumber }),
  );
  expect(answer.filing).toBeNull();
});

test('a device whose clock is three years slow still has its clip filed by the session', async () => {
  const place = await house.encounter();
  const person = await house.clinician(place.wardId);
  const threeYears = 3 * 365 * 86_400_000;
  const { agent, assetTag } = await house.enrolled({}, { clock: { now: () => Date.now() - threeYears } });
  await openSession(house.services, person, { encounterId: place.id, device: assetTag, takeOver: false });
  const { answer } = await sendRecording(
    agent,
    clipOf(chestWav(clean(), 8), { recordedAt: Date.now() - threeYears }),
  );
  expect(answer.filing?.encounter).toBe(place.number);
  expect(Math.abs((await rowOf(answer.recording)).recordedAt - Date.now())).toBeLessThan(60_000);
});

test('a clip that is cut off at the top is told to be recorded again, in words', async () => {
  const { agent } = await house.enrolled();
  const { answer } = await sendRecording(agent, clipOf(chestWav(clean({ faults: { clipGain: 30 } }), 9)));
  expect(answer.verdict).toBe('repeat');
  expect(answer.reasons.find((reason) => reason.code === 'clipped')).toMatchObject({
    severity: 'repeat',
    action: expect.stringContaining('Turn the gain down'),
  });
});

test('a sample rate that the model does not send is told so', async () => {
  const { agent } = await house.enrolled({ sampleRatesHz: [8000] });
  const { answer } = await sendRecording(agent, clipOf(chestWav(clean(), 10)));
  expect(answer.findings).toContainEqual(
    expect.objectContaining({ code: 'rate-unexpected', severity: 'repeat', value: 4000 }),
  );
});

test.each([
  ['text', new TextEncoder().encode('not a recording at all, just words\n'), 'unreadable'],
  ['nothing', new Uint8Array(0), 'unreadable'],
  ['a page in disguise', new TextEncoder().encode('<!doctype html><script>alert(1)</script>'), 'unreadable'],
  ['a header without samples', chestWav().slice(0, 44), 'empty'],
])('%s under the name of a WAV is taken, kept, and told to be recorded again', async (_name, bytes, code) => {
  const { agent } = await house.enrolled();
  const { answer } = await sendRecording(agent, clipOf(bytes));
  expect(answer.verdict).toBe('repeat');
  expect(answer.findings.map((finding) => finding.code)).toContain(code);
});

test('nothing secret and no patient stands in the log of all this', () => {
  const log = house.log.join('\n');
  expect(log.length).toBeGreaterThan(1000);
  expect(log).not.toMatch(/X-Amz-Signature=[0-9a-f]/i);
  expect(log).not.toMatch(/eyJ[\w-]+\.[\w-]+\.[\w-]+/);
  expect(log).not.toMatch(/Ashgrove|Freya/);
});
