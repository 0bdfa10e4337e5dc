import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { recording } from '@/db/schema';
import { closeSession } from '@/lib/filing/closeSession';
import { openSession } from '@/lib/filing/openSession';
import { readTray, TrayFilter } from '@/lib/filing/readTray';
import {
  type Bedside,
  bedsideAuthority,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
} from '@/tests/support/bedside';

let house: Bedside;
let alder: string;
let birch: string;
let solveig: Clinician;
let device: Device;
let freya: Encounter;
let emeka: Encounter;
let recordNumber: string;

beforeEach(async () => {
  house = await openBedside();
  alder = await house.ward('Alder');
  birch = await house.ward('Birch');
  solveig = await house.clinician([alder]);
  device = await house.device({ wardId: alder });
  const patient = await house.patient();
  recordNumber = patient.recordNumber;
  freya = await house.encounter(patient, { wardId: alder, bed: 'A5' });
  emeka = await house.encounter(await house.patient({ familyName: 'Thackeray', givenName: 'Emeka' }), {
    wardId: alder,
  });
});
afterEach(() => house.close());

const tray = (who = solveig, query: Record<string, string> = {}) =>
  readTray(house.services, bedsideAuthority(who), TrayFilter.parse(query));
const only = async (who = solveig) => {
  const { rows } = await tray(who);
  expect(rows).toHaveLength(1);
  const [row] = rows;
  if (!row) throw new Error('the tray is empty');
  return row;
};
const session = async (of: Encounter, minutes: number) => {
  const { id } = await openSession(house.services, bedsideAuthority(solveig), {
    encounterId: of.id,
    device: device.assetTag,
    takeOver: false,
  });
  house.clock.advance(minutes * 60_000);
  await closeSession(house.services, bedsideAuthority(solveig), id);
};

describe('why a clip is in the tray', () => {
  test('no session and no scan', async () => {
    await house.clip({ device });
    expect(await only()).toMatchObject({ why: 'no-session', scannedIdentifier: null });
  });

  test('a scan that means nobody', async () => {
    await house.clip({ device, scannedIdentifier: 'HGH-000-0000' });
    expect(await only()).toMatchObject({ why: 'identifier-unknown', scannedIdentifier: 'HGH-000-0000' });
  });

  test('a scan of a patient with two running encounters suggests both', async () => {
    const second = await house.encounter(
      { ...(await house.patient()), id: freya.patientId },
      { wardId: alder },
    );
    await house.clip({ device, scannedIdentifier: recordNumber });
    const row = await only();
    expect(row.why).toBe('identifier-ambiguous');
    expect(
      row.candidates
        .slice(0, 2)
        .map((one) => one.encounterId)
        .sort(),
    ).toEqual([freya.id, second.id].sort());
  });

  test('a scan against the open session suggests the scanned patient first', async () => {
    await openSession(house.services, bedsideAuthority(solveig), {
      encounterId: emeka.id,
      device: device.assetTag,
      takeOver: false,
    });
    await house.clip({ device, scannedIdentifier: recordNumber });
    const row = await only();
    expect(row.why).toBe('identifier-against-session');
    expect(row.candidates.map((one) => one.encounterId)).toEqual([freya.id, emeka.id]);
    expect(row.candidates[1]?.why[0]).toMatch(/^session S-2001 with this device was open$/);
  });

  test('a scan of an encounter that was over', async () => {
    const over = await house.encounter(await house.patient(), {
      wardId: alder,
      status: 'finished',
      startedAt: house.clock.now() - 9 * 86_400_000,
      endedAt: house.clock.now() - 86_400_000,
    });
    await house.clip({ device, scannedIdentifier: over.number });
    const row = await only();
    expect(row.why).toBe('encounter-over');
    expect(row.candidates[0]).toMatchObject({ encounterId: over.id });
    expect(row.candidates[0]?.why[0]).toContain('had ended by then');
  });
});

describe('where a stray clip may belong', () => {
  test('the session that had just ended with this device comes before those who were merely on the ward', async () => {
    await session(emeka, 5);
    house.clock.advance(4 * 60_000);
    await house.clip({ device });
    const { candidates } = await only();
    expect(candidates.map((one) => one.encounterId)).toEqual([emeka.id, freya.id]);
    expect(candidates[0]?.why[0]).toBe('session S-2001 with this device had ended 4 min before');
    expect(candidates[1]?.why).toEqual(['in Alder then, where the device belongs']);
  });

  test('a session that began shortly after is suggested', async () => {
    const at = house.clock.now();
    house.clock.advance(3 * 60_000);
    await session(emeka, 5);
    await house.clip({ device, recordedAt: at });
    const { candidates } = await only();
    expect(candidates[0]).toMatchObject({ encounterId: emeka.id });
    expect(candidates[0]?.why[0]).toBe('session S-2001 with this device began 3 min later');
  });

  test('whom the device recorded lately comes before the rest of the ward', async () => {
    await openSession(house.services, bedsideAuthority(solveig), {
      encounterId: emeka.id,
      device: device.assetTag,
      takeOver: false,
    });
    await house.clip({ device });
    house.clock.advance(1_000);
    await openSession(house.services, bedsideAuthority(solveig), {
      encounterId: freya.id,
      device: (await house.device()).assetTag,
      takeOver: true,
    });
    const { id } = await openSession(house.services, bedsideAuthority(solveig), {
      encounterId: emeka.id,
      device: device.assetTag,
      takeOver: false,
    });
    await closeSession(house.services, bedsideAuthority(solveig), id);
    house.clock.advance(3 * 86_400_000);
    await house.clip({ device });
    const { candidates } = await only();
    expect(candidates[0]).toMatchObject({ encounterId: emeka.id });
    expect(candidates[0]?.why[0]).toBe('this device recorded the patient 3 days before');
  });

  test('who came to the ward later, or left before, is not suggested', async () => {
    const at = house.clock.now() - 40 * 86_400_000;
    await house.clip({ device, recordedAt: at });
    expect((await only()).candidates).toEqual([]);
  });

  test('an encounter on a ward that the person does not see is not suggested, whoever was scanned', async () => {
    const elsewhere = await house.patient({ familyName: 'Outside' });
    await house.encounter(elsewhere, { wardId: birch });
    await house.encounter(elsewhere, { wardId: birch });
    await house.clip({ device, scannedIdentifier: elsewhere.recordNumber });
    const { candidates } = await only();
    expect(candidates.map((one) => one.familyName)).not.toContain('Outside');
  });

  test('no score is shown', async () => {
    await house.clip({ device });
    const [candidate] = (await only()).candidates;
    expect(Object.values(candidate ?? {}).filter((value) => typeof value === 'number')).toEqual([]);
  });
});

describe('the tray', () => {
  test('holds clips of one’s wards’ devices and of devices that belong to no ward, and no others', async () => {
    const own = await house.clip({ device });
    const noWard = await house.clip({ device: await house.device() });
    await house.clip({ device: await house.device({ wardId: birch }) });
    const { rows } = await tray();
    expect(rows.map((row) => row.number).sort()).toEqual([own.number, noWard.number].sort());
  });

  test('is turned over page by page without losing or repeating a clip, even of the same moment', async () => {
    const at = house.clock.now();
    const frozen = { ...house.services, clock: { now: () => at } };
    const numbers: string[] = [];
    for (let i = 0; i < 7; i++) numbers.push((await house.clip({ device })).number);
    await house.services.write(async (tx) => void (await tx.update(recording).set({ measuredAt: at })));
    const seen: string[] = [];
    let before: string | null = null;
    do {
      const page: Awaited<ReturnType<typeof readTray>> = await readTray(
        frozen,
        bedsideAuthority(solveig),
        TrayFilter.parse({ limit: '3', ...(before ? { before } : {}) }),
      );
      seen.push(...page.rows.map((row) => row.number));
      before = page.next;
    } while (before);
    expect(seen).toHaveLength(7);
    expect(seen.sort()).toEqual(numbers.sort());
  });
});
