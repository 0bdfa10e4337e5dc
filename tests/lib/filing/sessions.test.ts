import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { deviceModel, device as devices, encounter, listeningSession } from '@/db/schema';
import { closeSession } from '@/lib/filing/closeSession';
import { endForgottenSessions, QUIET_SESSION_MS } from '@/lib/filing/endForgottenSessions';
import { openSession } from '@/lib/filing/openSession';
import { readSession } from '@/lib/filing/readSession';
import {
  type Bedside,
  bedsideAuthority,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
} from '@/tests/support/bedside';
import { entriesOf, kindsOf } from '@/tests/support/entries';

let house: Bedside;
let solveig: Clinician;
let pascal: Clinician;
let device: Device;
let freya: Encounter;
let emeka: Encounter;

beforeEach(async () => {
  house = await openBedside();
  const alder = await house.ward('Alder');
  solveig = await house.clinician([alder], { name: 'Dr Solveig Adeyemi' });
  pascal = await house.clinician([alder], { name: 'Dr Pascal Ngata' });
  device = await house.device({ wardId: alder, udi: '(01)09506000134352(21)OC4-551037' });
  freya = await house.encounter(await house.patient(), { wardId: alder });
  emeka = await house.encounter(await house.patient({ familyName: 'Thackeray', givenName: 'Emeka' }), {
    wardId: alder,
  });
});
afterEach(() => house.close());

const open = (who: Clinician, of: Encounter, more: { device?: string; takeOver?: boolean } = {}) =>
  openSession(house.services, bedsideAuthority(who), {
    encounterId: of.id,
    device: device.assetTag,
    takeOver: false,
    ...more,
  });
const rows = () => house.services.read.select().from(listeningSession).orderBy(listeningSession.number);

describe('opening a listening session', () => {
  test('is a line in the log that names session, device, encounter and patient', async () => {
    const opened = await open(solveig, freya);
    expect(opened).toMatchObject({ number: 'S-2001', wasOpen: false });
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'session-opened',
      actor: { id: solveig.id, role: 'clinician' },
      subjects: [
        { kind: 'session', id: opened.id },
        { kind: 'device', id: device.id },
        { kind: 'encounter', id: freya.id },
        { kind: 'patient', id: freya.patientId },
      ],
      detail: { number: 'S-2001', assetTag: device.assetTag, encounter: freya.number },
    });
  });

  // GS1 General Specifications: application identifiers stand in brackets for people; a scanner sends a symbology
  // identifier (ISO/IEC 15424) and FNC1 as character 29 instead. From memory.
  test.each([
    ['asset tag in small letters', (one: Device) => one.assetTag.toLowerCase()],
    ['serial number', (one: Device) => one.serialNumber],
    ['UDI as printed', () => '(01)09506000134352(21)OC4-551037'],
    ['UDI as scanned', () => ']d20109506000134352\u001d21OC4-551037'],
  ])('takes a device by its %s', async (_what, word) => {
    await open(solveig, freya, { device: word(device) });
    expect((await rows())[0]).toMatchObject({ deviceId: device.id, encounterId: freya.id });
  });

  test('an asset tag that reads like another device’s serial number means the one that is tagged so', async () => {
    await house.device({ serialNumber: device.assetTag });
    await open(solveig, freya);
    expect((await rows())[0]?.deviceId).toBe(device.id);
  });

  test('a serial number that two models share asks for the asset tag', async () => {
    const { id: _id, ...one } = await house.device({ serialNumber: 'SAME' });
    await house.services.write(async (tx) => {
      const [model] = await tx.select().from(deviceModel).limit(1);
      if (!model) throw new Error('no model');
      await tx.insert(deviceModel).values({ ...model, id: 'another-model', name: 'Any Two' });
      await tx.insert(devices).values({ ...one, id: 'twin', assetTag: 'HM-TWIN', modelId: 'another-model' });
    });
    await expect(open(solveig, freya, { device: 'SAME' })).rejects.toMatchObject({
      code: 'not-possible',
      detail: expect.stringContaining('More than one device'),
    });
  });

  test.each(['waiting', 'quarantined', 'in-repair', 'lost', 'retired'] as const)(
    'is refused with a device that is %s, and nothing is written',
    async (state) => {
      const bad = await house.device({ state });
      await expect(open(solveig, freya, { device: bad.assetTag })).rejects.toMatchObject({
        code: 'not-possible',
      });
      expect(await rows()).toEqual([]);
      expect(await kindsOf(house)).not.toContain('session-opened');
    },
  );

  test.each(['planned', 'finished', 'cancelled'] as const)(
    'is refused for an encounter that is %s',
    async (status) => {
      await house.services.write(
        async (tx) => void (await tx.update(encounter).set({ status }).where(eq(encounter.id, freya.id))),
      );
      await expect(open(solveig, freya)).rejects.toMatchObject({ code: 'not-possible' });
    },
  );

  test('again for the same patient and device answers with the session that is open', async () => {
    const first = await open(solveig, freya);
    expect(await open(pascal, freya)).toEqual({ ...first, wasOpen: true });
    expect(await rows()).toHaveLength(1);
  });
});

describe('a device that is in another session', () => {
  test('is refused with which session, whose and since when', async () => {
    const first = await open(solveig, freya);
    const since = (await rows())[0]?.openedAt;
    await expect(open(pascal, emeka)).rejects.toMatchObject({
      code: 'not-possible',
      detail: expect.stringContaining('Dr Solveig Adeyemi'),
      extra: { session: first.number, since, openedBy: 'Dr Solveig Adeyemi', takeOver: true },
    });
    expect(await rows()).toHaveLength(1);
  });

  test('can be taken over: the old session ends because the device moved, in the same step', async () => {
    const first = await open(solveig, freya);
    const second = await open(pascal, emeka, { takeOver: true });
    expect(second.number).toBe('S-2002');
    const [old, fresh] = await rows();
    expect(old).toMatchObject({ id: first.id, closedWhy: 'device-moved', closedBy: pascal.id });
    expect(fresh).toMatchObject({ id: second.id, closedAt: null, encounterId: emeka.id });
    expect(old?.closedAt).toBe(fresh?.openedAt);
    expect((await kindsOf(house)).slice(-2)).toEqual(['session-closed', 'session-opened']);
  });

  test('taken over by two at once is in one session in the end', async () => {
    const gerda = await house.encounter(await house.patient());
    await open(solveig, freya);
    await Promise.all([open(pascal, emeka, { takeOver: true }), open(solveig, gerda, { takeOver: true })]);
    expect((await rows()).filter((row) => row.closedAt === null)).toHaveLength(1);
  });

  test('opened by two at once for two patients is opened by one, and the other is told', async () => {
    const results = await Promise.allSettled([open(solveig, freya), open(pascal, emeka)]);
    expect(results.map(({ status }) => status).sort()).toEqual(['fulfilled', 'rejected']);
    expect(await rows()).toHaveLength(1);
  });
});

describe('a clip', () => {
  test('of any verdict is filed by the session it was recorded in', async () => {
    const { id } = await open(solveig, freya);
    for (const verdict of ['usable', 'care', 'repeat'] as const) {
      const clip = await house.clip({ device, verdict });
      expect(clip.stage).toBe('filed');
      expect(await house.filings(clip.id)).toMatchObject([
        { encounterId: freya.id, patientId: freya.patientId, by: 'session', sessionId: id },
      ]);
    }
    expect((await readSession(house.services, id))?.clips).toHaveLength(3);
  });

  test('that arrives after the session ended is filed by when it was recorded', async () => {
    const { id } = await open(solveig, freya);
    const during = house.clock.now();
    house.clock.advance(60_000);
    await closeSession(house.services, bedsideAuthority(solveig), id);
    house.clock.advance(3_600_000);
    expect(await house.clip({ device, recordedAt: during })).toMatchObject({ stage: 'filed' });
    expect(await house.clip({ device })).toMatchObject({ stage: 'measured' });
  });

  test('after a takeover goes to the new patient, and one from before it to the old', async () => {
    await open(solveig, freya);
    const before = house.clock.now();
    house.clock.advance(30_000);
    await open(pascal, emeka, { takeOver: true });
    house.clock.advance(30_000);
    const late = await house.clip({ device, recordedAt: before });
    const fresh = await house.clip({ device });
    expect((await house.filings(late.id))[0]?.encounterId).toBe(freya.id);
    expect((await house.filings(fresh.id))[0]?.encounterId).toBe(emeka.id);
  });

  test('of another device is not of this session', async () => {
    const { id } = await open(solveig, freya);
    await house.clip({ device: await house.device() });
    expect((await readSession(house.services, id))?.clips).toEqual([]);
  });
});

describe('ending', () => {
  test('is written once, however often it is asked, and the answer says when', async () => {
    const { id } = await open(solveig, freya);
    const first = await closeSession(house.services, bedsideAuthority(solveig), id);
    house.clock.advance(60_000);
    expect(await closeSession(house.services, bedsideAuthority(pascal), id)).toEqual(first);
    expect((await kindsOf(house)).filter((kind) => kind === 'session-closed')).toHaveLength(1);
  });

  test('of what does not exist is not found', async () => {
    await expect(closeSession(house.services, bedsideAuthority(solveig), 'not-there')).rejects.toMatchObject({
      code: 'not-found',
    });
  });
});

describe('a session that was forgotten', () => {
  test('ends by itself after two hours without a clip, and the next clip goes to the tray', async () => {
    await open(solveig, freya);
    house.clock.advance(QUIET_SESSION_MS - 60_000);
    expect(await endForgottenSessions(house.services)).toBe(0);
    house.clock.advance(120_000);
    expect(await endForgottenSessions(house.services)).toBe(1);
    expect(await rows()).toMatchObject([{ closedWhy: 'timeout', closedBy: 'bellkeep' }]);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'session-closed',
      actor: { kind: 'service' },
    });
    expect(await house.clip({ device })).toMatchObject({ stage: 'measured' });
    expect(await endForgottenSessions(house.services)).toBe(0);
  });

  test('stays open while clips come', async () => {
    await open(solveig, freya);
    house.clock.advance(QUIET_SESSION_MS - 60_000);
    await house.clip({ device });
    house.clock.advance(QUIET_SESSION_MS - 60_000);
    expect(await endForgottenSessions(house.services)).toBe(0);
  });

  test('ends at once when its encounter is over', async () => {
    await open(solveig, freya);
    await house.services.write(
      async (tx) =>
        void (await tx.update(encounter).set({ status: 'finished' }).where(eq(encounter.id, freya.id))),
    );
    expect(await endForgottenSessions(house.services)).toBe(1);
  });
});
