import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as keepRoute } from '@/app/api/recordings/[id]/keep/route';
import { POST as moveRoute } from '@/app/api/recordings/[id]/move/route';
import { GET as recordingRoute } from '@/app/api/recordings/[id]/route';
import { GET as listRoute } from '@/app/api/recordings/route';
import {
  type Bedside,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
  type Patient,
  type Recording,
  wristbandOf,
} from '@/tests/support/bedside';
import { call, problemOf } from '@/tests/support/call';

let house: Bedside;
let alder: string;
let birch: string;
let solveig: Clinician;
let elsewhere: Clinician;
let device: Device;
let freya: Patient;
let place: Encounter;

beforeEach(async () => {
  house = await openBedside({ env: { BELLKEEP_TIME_ZONE: 'Europe/Berlin' } });
  alder = await house.ward('Alder');
  birch = await house.ward('Birch');
  solveig = await house.clinician([alder, birch]);
  elsewhere = await house.clinician([await house.ward('Cedar')]);
  device = await house.device({ wardId: alder });
  freya = await house.patient();
  place = await house.encounter(freya, { wardId: alder, startedAt: 0 });
});
afterEach(() => house.close());

const filed = (more: Partial<Parameters<Bedside['clip']>[0]> = {}) =>
  house.clip({ device, scannedIdentifier: place.number, ...more });
const list = async (query = '', who = solveig) => {
  const answer = await call(listRoute, { path: `/api/recordings${query}`, cookie: who.cookie });
  return (await answer.json()) as { rows: { number: string }[]; next: string | null };
};
const numbers = async (query = '', who = solveig) => (await list(query, who)).rows.map((row) => row.number);
const read = (number: string, who = solveig) =>
  call(recordingRoute, { params: { id: number }, cookie: who.cookie });

describe('the list', () => {
  test('holds filed clips of one’s wards, newest first, and no stray ones', async () => {
    const old = await filed({ recordedAt: house.clock.now() - 60_000 });
    const fresh = await filed();
    await house.clip({ device });
    expect(await numbers()).toEqual([fresh.number, old.number]);
    expect(await numbers('', elsewhere)).toEqual([]);
  });

  test('narrows by verdict, device, ward and search', async () => {
    const bad = await filed({ verdict: 'repeat' });
    const other = await filed({ device: await house.device({ wardId: alder }) });
    expect(await numbers('?verdict=repeat')).toEqual([bad.number]);
    expect(await numbers(`?device=${device.assetTag.toLowerCase()}`)).toEqual([bad.number]);
    expect(await numbers(`?ward=${birch}`)).toEqual([]);
    expect((await numbers(`?ward=${alder}`)).sort()).toEqual([bad.number, other.number].sort());
    expect(await numbers(`?q=${bad.number.slice(0, 6)}`)).toEqual([bad.number]);
    expect(await numbers(`?q=${place.number}`)).toHaveLength(2);
    expect(await numbers('?q=%25')).toEqual([]);
  });

  // Europe/Berlin is two hours ahead of UTC on 1 July (IANA time zone database).
  test('takes days as the hospital’s clock has them, both ends included', async () => {
    const at = (time: string) => filed({ recordedAt: Date.parse(time) });
    await at('2026-06-30T21:59:59Z');
    const first = await at('2026-06-30T22:00:00Z');
    const last = await at('2026-07-01T21:59:59Z');
    await at('2026-07-01T22:00:00Z');
    expect(await numbers('?from=2026-07-01&to=2026-07-01')).toEqual([last.number, first.number]);
  });

  test('is turned over page by page, clips of the same moment too', async () => {
    const recordedAt = house.clock.now();
    const made: string[] = [];
    for (let i = 0; i < 5; i++) made.push((await filed({ recordedAt })).number);
    const seen: string[] = [];
    let before = '';
    do {
      const page = await list(`?limit=2${before}`);
      seen.push(...page.rows.map((row) => row.number));
      before = page.next ? `&before=${encodeURIComponent(page.next)}` : '';
    } while (before);
    expect(seen).toHaveLength(5);
    expect(seen.sort()).toEqual(made.sort());
  });

  test.each(['verdict=good', 'from=yesterday', 'before=x', 'limit=0', 'nonsense=1'])(
    'refuses %s in its address',
    async (query) => {
      const answer = await call(listRoute, { path: `/api/recordings?${query}`, cookie: solveig.cookie });
      expect((await problemOf(answer)).code).toBe('body-invalid');
    },
  );
});

describe('one recording', () => {
  test('is read by its number in any case, without keys of the store', async () => {
    const clip = await filed({ bytes: new Uint8Array([1, 2, 3]) });
    const answer = await read(clip.number.toLowerCase());
    const text = await answer.text();
    expect(JSON.parse(text)).toMatchObject({
      number: clip.number,
      patient: { recordNumber: freya.recordNumber },
      filing: { by: 'identifier', encounterNumber: place.number },
      version: clip.version,
    });
    expect(text).not.toContain(clip.originalKey ?? 'no key');
    expect(text).not.toContain(clip.slotKey);
  });

  test('of another ward answers like one that does not exist', async () => {
    const clip = await filed();
    const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
    const hidden = await read(clip.number, elsewhere);
    expect(hidden.status).toBe(404);
    expect(await without(hidden)).toEqual(await without(await read('2222-2222', elsewhere)));
  });

  test('in the tray is opened by the ward of its device alone', async () => {
    const clip = await house.clip({ device });
    expect((await read(clip.number)).status).toBe(200);
    expect((await read(clip.number, elsewhere)).status).toBe(404);
  });
});

describe('moving', () => {
  const move = (
    clip: Recording,
    to: Encounter,
    of: Patient,
    more: Record<string, unknown> = {},
    who = solveig,
  ) =>
    call(moveRoute, {
      params: { id: clip.number },
      body: {
        encounterId: to.id,
        identifiers: wristbandOf(of),
        reason: 'Recorded at the wrong bed',
        version: clip.version,
        ...more,
      },
      cookie: who.cookie,
    });

  test('goes to an encounter that one may see, with a reason, and takes the clip out of the first', async () => {
    const emeka = await house.patient({ familyName: 'Thackeray' });
    const to = await house.encounter(emeka, { wardId: birch });
    const clip = await filed();
    expect(await (await move(clip, to, emeka)).json()).toEqual({
      recording: clip.number,
      encounter: to.number,
    });
    expect(await (await read(clip.number)).json()).toMatchObject({
      filing: { encounterNumber: to.number, by: 'person', reason: 'Recorded at the wrong bed' },
    });
  });

  test('is refused to a patient whom one may not see, as if there were none', async () => {
    const outsider = await house.patient();
    const outside = await house.encounter(outsider, { wardId: elsewhere.wardIds[0] ?? null });
    const clip = await filed();
    expect((await problemOf(await move(clip, outside, outsider))).code).toBe('not-found');
    expect((await problemOf(await move(clip, place, freya, {}, elsewhere))).code).toBe('not-found');
    expect(await house.filings(clip.id)).toHaveLength(1);
  });

  test('without a reason, or with one too short, is refused', async () => {
    const to = await house.encounter(freya, { wardId: birch });
    const clip = await filed();
    for (const reason of [undefined, '', 'why '])
      expect((await problemOf(await move(clip, to, freya, { reason }))).code).toBe('body-invalid');
  });

  test('of what was changed since the page was drawn says where it is now', async () => {
    const to = await house.encounter(freya, { wardId: birch });
    const clip = await filed();
    const { code, body } = await problemOf(await move(clip, to, freya, { version: clip.version - 1 }));
    expect(code).toBe('stale');
    expect(body).toMatchObject({ version: clip.version, encounter: place.number });
  });
});

describe('keeping', () => {
  const keep = (clip: Recording, who = solveig, reason = 'The child would not allow another') =>
    call(keepRoute, { params: { id: clip.number }, body: { reason }, cookie: who.cookie });

  test('is for a clip that should be recorded again, by whoever may see it', async () => {
    const clip = await filed({ verdict: 'repeat' });
    expect((await problemOf(await keep(clip, elsewhere))).code).toBe('not-found');
    expect((await keep(clip)).status).toBe(200);
    expect(await (await read(clip.number)).json()).toMatchObject({
      verdict: 'repeat',
      keptReason: 'The child would not allow another',
    });
    expect((await keep(await filed())).status).toBe(409);
  });
});
