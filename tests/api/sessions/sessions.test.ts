import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { GET as pickRoute } from '@/app/api/devices/pick/route';
import { POST as closeRoute } from '@/app/api/sessions/[id]/close/route';
import { GET as sessionRoute } from '@/app/api/sessions/[id]/route';
import { POST as openRoute } from '@/app/api/sessions/route';
import {
  type Bedside,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
} from '@/tests/support/bedside';
import { call, problemOf } from '@/tests/support/call';
import { kindsOf } from '@/tests/support/entries';

let house: Bedside;
let solveig: Clinician;
let elsewhere: Clinician;
let device: Device;
let freya: Encounter;

beforeEach(async () => {
  house = await openBedside();
  const alder = await house.ward('Alder');
  solveig = await house.clinician([alder]);
  elsewhere = await house.clinician([await house.ward('Birch')]);
  device = await house.device({ wardId: alder });
  freya = await house.encounter(await house.patient(), { wardId: alder });
});
afterEach(() => house.close());

const open = (who: Clinician, more: Record<string, unknown> = {}, headers: Record<string, string> = {}) =>
  call(openRoute, {
    body: { encounterId: freya.id, device: device.assetTag, ...more },
    cookie: who.cookie,
    headers,
  });
const opened = async (): Promise<string> => ((await (await open(solveig)).json()) as { id: string }).id;
const read = (id: string, who = solveig) => call(sessionRoute, { params: { id }, cookie: who.cookie });
const close = (id: string, who = solveig) =>
  call(closeRoute, { params: { id }, body: {}, cookie: who.cookie });

test('a session is opened once, and again for the same patient leads to it', async () => {
  const first = await open(solveig);
  expect(first.status).toBe(201);
  const again = await open(solveig);
  expect(again.status).toBe(200);
  expect(await again.json()).toEqual({ ...((await first.json()) as object), wasOpen: true });
});

test('an opening whose answer was lost is answered again with the same session', async () => {
  const headers = { 'idempotency-key': 'one-and-the-same' };
  const first = await open(solveig, {}, headers);
  const again = await open(solveig, {}, headers);
  expect(again.headers.get('idempotency-replayed')).toBe('true');
  expect(await again.json()).toEqual(await first.json());
  expect((await kindsOf(house)).filter((kind) => kind === 'session-opened')).toHaveLength(1);
});

test('the session shows patient, device and clips, and a clip of its window turns up in it', async () => {
  const id = await opened();
  const clip = await house.clip({
    device,
    verdict: 'repeat',
    findings: [{ code: 'clipped', severity: 'repeat' }],
  });
  expect(await (await read(id)).json()).toMatchObject({
    encounterNumber: freya.number,
    familyName: 'Ashgrove',
    birthDate: '1956-08-17',
    assetTag: device.assetTag,
    closedAt: null,
    clips: [{ number: clip.number, verdict: 'repeat', findings: [{ code: 'clipped', severity: 'repeat' }] }],
  });
});

test('a device in another session is answered with which and since when', async () => {
  await opened();
  const emeka = await house.encounter(await house.patient(), { wardId: freya.wardId });
  const refused = await open(solveig, { encounterId: emeka.id });
  expect(refused.status).toBe(409);
  expect((await problemOf(refused)).body).toMatchObject({
    session: 'S-2001',
    since: expect.any(Number),
    takeOver: true,
  });
  expect((await open(solveig, { encounterId: emeka.id, takeOver: true })).status).toBe(201);
});

test('ending a session is told, and ending it again answers the same', async () => {
  const id = await opened();
  const first = await (await close(id)).json();
  expect(await (await close(id)).json()).toEqual(first);
  expect(await (await read(id)).json()).toMatchObject({ closedWhy: 'ended' });
});

describe('somebody of another ward', () => {
  test('can neither open, read nor end a session here, and is answered as if there were none', async () => {
    const id = await opened();
    const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
    const missing = await without(await read('not-there', elsewhere));
    expect(await without(await read(id, elsewhere))).toEqual(missing);
    expect(await without(await close(id, elsewhere))).toEqual(missing);
    expect(await without(await open(elsewhere))).toEqual(missing);
    expect(await (await read(id)).json()).toMatchObject({ closedAt: null });
  });
});

describe('choosing a stethoscope', () => {
  const pick = async (q = '') =>
    (
      (await (
        await call(pickRoute, {
          path: `/api/devices/pick?q=${encodeURIComponent(q)}`,
          cookie: solveig.cookie,
        })
      ).json()) as { results: { assetTag: string; inSession: string | null }[] }
    ).results;

  test('shows those of one’s wards that are in service, and which session one is in', async () => {
    await house.device({ wardId: freya.wardId, state: 'in-repair' });
    const other = await house.device();
    await opened();
    expect((await pick()).map((one) => [one.assetTag, one.inSession])).toEqual([[device.assetTag, 'S-2001']]);
    expect((await pick(other.assetTag)).map((one) => one.assetTag)).toEqual([other.assetTag]);
  });
});
