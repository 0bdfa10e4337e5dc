import { eq } from 'drizzle-orm';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { credential, device, listeningSession } from '@/db/schema';
import { heartbeat } from '@/devices/agent/heartbeat';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { addDevice } from '@/lib/fleet/addDevice';
import { changeState } from '@/lib/fleet/changeState';
import { fleetCsv, inertCell } from '@/lib/fleet/csv';
import { describeModel } from '@/lib/fleet/describeModel';
import { countFleet, FleetFilter, readFleet } from '@/lib/fleet/readFleet';
import { ANY_MODEL, openPassageHouse, type PassageHouse } from '../../support/passageHouse';

let house: PassageHouse;
const engineer = {
  id: 'be',
  name: 'Engineer',
  email: '',
  jobTitle: null,
  roles: ['biomed'],
  wardIds: [],
  sessionId: '',
} as never;
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(() => house.close());

const rowOf = async (id: string) =>
  (await house.services.read.select().from(device).where(eq(device.id, id)))[0];
const change = async (id: string, to: 'in-service' | 'quarantined' | 'in-repair' | 'retired') =>
  changeState(house.services, engineer, id, {
    to,
    reason: 'for this test',
    version: (await rowOf(id))?.version ?? 0,
  });

test('an asset tag or a serial number of the same model is on the list once, and the field is named', async () => {
  const modelId = await describeModel(house.services, SERVICE_ACTOR, { ...ANY_MODEL, name: 'Once' });
  const wanted = {
    assetTag: 'HM-1',
    serialNumber: 'S',
    modelId,
    wardId: null,
    udi: null,
    lot: null,
    firmware: null,
  };
  await addDevice(house.services, SERVICE_ACTOR, wanted);
  await expect(
    addDevice(house.services, SERVICE_ACTOR, { ...wanted, serialNumber: 'T' }),
  ).rejects.toMatchObject({ code: 'body-invalid', extra: { errors: [{ path: 'assetTag' }] } });
  await expect(
    addDevice(house.services, SERVICE_ACTOR, { ...wanted, assetTag: 'HM-2' }),
  ).rejects.toMatchObject({ extra: { errors: [{ path: 'serialNumber' }] } });
  await expect(
    addDevice(house.services, SERVICE_ACTOR, {
      ...wanted,
      assetTag: 'HM-3',
      serialNumber: 'U',
      modelId: 'none',
    }),
  ).rejects.toMatchObject({ extra: { errors: [{ path: 'modelId' }] } });
});

test('service states follow each other as they may, each with its reason', async () => {
  const { id } = await house.enrolled();
  await change(id, 'quarantined');
  await change(id, 'in-repair');
  await change(id, 'in-service');
  expect(await rowOf(id)).toMatchObject({ state: 'in-service', stateReason: 'for this test' });
  const waiting = await house.listDevice();
  await expect(change(waiting.id, 'in-service')).rejects.toMatchObject({ code: 'not-possible' });
});

test('a retired device ends its credentials and never comes back', async () => {
  const { id, agent } = await house.enrolled();
  await change(id, 'retired');
  expect(
    (await house.services.read.select().from(credential).where(eq(credential.deviceId, id))).map(
      (row) => row.state,
    ),
  ).toEqual(['revoked']);
  await expect(heartbeat(agent)).rejects.toMatchObject({ code: 'token-invalid' });
  await expect(change(id, 'in-service')).rejects.toMatchObject({ code: 'not-possible' });
});

test('a device taken out of service ends its listening session', async () => {
  const place = await house.encounter();
  const person = await house.clinician(place.wardId);
  const { id, assetTag } = await house.enrolled();
  const { openSession } = await import('@/lib/filing/openSession');
  await openSession(house.services, person, { encounterId: place.id, device: assetTag, takeOver: false });
  await change(id, 'quarantined');
  expect(
    (await house.services.read.select().from(listeningSession).where(eq(listeningSession.deviceId, id)))[0]
      ?.closedAt,
  ).not.toBeNull();
});

test('of two people who change a device at once one is told that it changed', async () => {
  const { id } = await house.enrolled();
  const version = (await rowOf(id))?.version ?? 0;
  const results = await Promise.allSettled(
    ['quarantined', 'in-repair'].map((to) =>
      changeState(house.services, engineer, id, { to: to as 'quarantined', reason: 'both at once', version }),
    ),
  );
  expect(results.map((result) => result.status).sort()).toEqual(['fulfilled', 'rejected']);
});

test('a change of firmware is history', async () => {
  const { id, agent } = await house.enrolled();
  await heartbeat(agent, { firmware: '1.0', batteryPercent: 80 });
  await heartbeat(agent, { firmware: '1.1' });
  await heartbeat(agent, { firmware: '1.1' });
  const changes = await house.services.read.query.firmwareChange.findMany({
    where: (t) => eq(t.deviceId, id),
  });
  expect(changes.map((one) => [one.from, one.to])).toEqual([
    [null, '1.0'],
    ['1.0', '1.1'],
  ]);
  expect(await rowOf(id)).toMatchObject({ firmware: '1.1', batteryPercent: 80 });
});

test('the fleet is paged in every order without losing or repeating a device', async () => {
  const all = (await readFleet(house.services, engineer, FleetFilter.parse({ limit: 1000 }))).rows.map(
    (row) => row.id,
  );
  for (const sort of ['assetTag', '-assetTag', 'lastHeard', '-checkDue'] as const) {
    const seen: string[] = [];
    let after: string | undefined;
    do {
      const page = await readFleet(
        house.services,
        engineer,
        FleetFilter.parse({ sort, limit: 3, ...(after ? { after } : {}) }),
      );
      seen.push(...page.rows.map((row) => row.id));
      after = page.next ?? undefined;
    } while (after);
    expect([...seen].sort(), sort).toEqual([...all].sort());
    expect(new Set(seen).size, sort).toBe(seen.length);
  }
});

test('a place in a list that was made up opens the list from its start', () => {
  expect(FleetFilter.safeParse({ after: 'not json' }).success).toBe(false);
  expect(FleetFilter.safeParse({ after: '{"a":1}' }).success).toBe(false);
});

test('counts and filters agree', async () => {
  const counts = await countFleet(house.services, engineer);
  for (const [state, count] of [
    ['in-service', counts.inService],
    ['quarantined', counts.quarantined],
    ['waiting', counts.waiting],
  ] as const) {
    expect(
      (await readFleet(house.services, engineer, FleetFilter.parse({ state, limit: 1000 }))).rows.length,
    ).toBe(count);
  }
});

// OWASP, CSV Injection (from memory): cells that begin with = + - @ tab or return.
test('a cell that a spreadsheet would run is inert', () => {
  expect(['=1+1', '+1', '-1', '@x', '\tx', '\rx', 'HM-1'].map(inertCell)).toEqual([
    "'=1+1",
    "'+1",
    "'-1",
    "'@x",
    "'\tx",
    "'\rx",
    'HM-1',
  ]);
});

test('spaces, a line feed or full width before it hide no formula', () => {
  const cells = [' =1+1', '\n=1', '\nx', '＝1+1', '－1', '＋1', '＠x'];
  expect(cells.map(inertCell)).toEqual(cells.map((cell) => `'${cell}`));
  expect(['a=1', 'x - y', '', 'HM-1 '].map(inertCell)).toEqual(['a=1', 'x - y', '', 'HM-1 ']);
});

test('the exported fleet is CSV with a line a device', async () => {
  const { rows } = await readFleet(house.services, engineer, FleetFilter.parse({ limit: 1000 }));
  const text = fleetCsv(rows);
  expect(text.split('\r\n')[0]).toMatch(/^asset tag,serial number,/);
  expect(text.trim().split('\r\n')).toHaveLength(rows.length + 1);
});
