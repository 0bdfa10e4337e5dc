import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { eq } from 'drizzle-orm';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { device, recording } from '@/db/schema';
import type { FleetEvent } from '@/devices/fleet/events';
import { startFleet } from '@/devices/fleet/fleet';
import { FAULTS } from '@/devices/fleet/options';
import { openPassageHouse, type PassageHouse } from '../support/passageHouse';

let house: PassageHouse;
const folder = mkdtempSync(join(tmpdir(), 'bellkeep-fleet-'));
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(async () => {
  await house.close();
  rmSync(folder, { recursive: true, force: true });
});

test('through lost answers, cut uploads, wrong clocks and lost power every recorded clip arrives once', async () => {
  const devices = [];
  for (let i = 0; i < 3; i++) {
    const { serialNumber, code } = await house.listDevice();
    devices.push({ serialNumber, code });
  }
  const events: FleetEvent[] = [];
  await startFleet({
    origin: house.origin,
    devices,
    seed: 11,
    pace: 1e9,
    clipsEach: 4,
    clipSeconds: 6,
    faults: FAULTS.harsh,
    stateFolder: folder,
    sleep: async () => undefined,
    onEvent: (event) => events.push(event),
  }).ended;
  const recorded = events.flatMap((event) =>
    event.kind === 'recorded' ? [`${event.serialNumber} ${event.recordingNumber}`] : [],
  );
  const rows = await house.services.read
    .select({ serial: device.serialNumber, id: device.id, rec: recording })
    .from(recording)
    .innerJoin(device, eq(device.id, recording.deviceId));
  const arrived = rows.map((row) => `${row.serial} ${row.rec.deviceRecordingNumber}`);
  expect(new Set(arrived).size).toBe(arrived.length);
  for (const clip of recorded) expect(arrived).toContain(clip);
  for (const { rec } of rows) expect(['measured', 'filed']).toContain(rec.stage);
  expect(events.some((event) => event.kind === 'rebooted')).toBe(true);
});
