import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { GET } from '@/app/api/health/route';
import { device, deviceModel, outbox } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { readHealth } from '@/lib/health/readHealth';
import type { HealthPart } from '@/lib/health/types';
import { tendHeads } from '@/lib/http/treeHeads';
import { beat, beginPulse } from '@/lib/platform/pulse';
import { type House, ORIGIN, openHouse } from '../../support/services';

let house: House;
beforeEach(async () => {
  house = await openHouse({ storage: true });
  beginPulse(house.clock.now());
  delete (globalThis as { bellkeepDeepHealth?: unknown }).bellkeepDeepHealth;
});
afterEach(() => house.close());

const look = async (id: HealthPart['id'], pool: Parameters<typeof readHealth>[1] = null) => {
  const part = (await readHealth(house.services, pool)).find((one) => one.id === id);
  if (!part) throw new Error(`nobody looked at ${id}`);
  return part;
};
const happens = (nowMs = house.clock.now()) =>
  house.services.write(
    async (tx) =>
      void (await appendEntries(tx, nowMs, [{ kind: 'heard', actor: SERVICE_ACTOR, subjects: [] }])),
  );
const waits = (ageMs: number, more = {}) =>
  house.services.write(async (tx) => {
    const at = house.clock.now() - ageMs;
    await tx
      .insert(outbox)
      .values({ id: crypto.randomUUID(), kind: 'mail', payload: {}, createdAt: at, dueAt: at, ...more });
  });

describe('a house that is well', () => {
  test('says so of each of its parts', async () => {
    const parts = await readHealth(house.services, { size: 2, busy: 1, waiting: 0 });
    expect(parts.map(({ id }) => id)).toEqual([
      'database',
      'storage',
      'outbox',
      'sweep',
      'heads',
      'pool',
      'clocks',
      'disk',
    ]);
    expect(parts.filter(({ state, id }) => state !== 'good' && id !== 'disk')).toEqual([]);
  });

  test('tells a proxy that it is there, and a supervisor how its parts are, in one word each', async () => {
    expect(await (await GET(new Request(`${ORIGIN}/api/health`))).json()).toEqual({ ok: true });
    const deep = await GET(new Request(`${ORIGIN}/api/health?deep`));
    const { parts } = (await deep.json()) as { parts: Record<string, string> };
    expect(Object.values(parts).every((state) => ['good', 'care', 'alarm'].includes(state))).toBe(true);
    expect(parts).toMatchObject({ database: 'good', storage: 'good', outbox: 'good' });
  });
});

describe('storage that does not answer', () => {
  test('is an alarm, the other parts are still looked at, and a supervisor gets 503', async () => {
    await house.fake.close();
    expect(await look('storage')).toMatchObject({ state: 'alarm', sentence: 'It does not answer.' });
    expect(await look('database')).toMatchObject({ state: 'good' });
    const deep = await GET(new Request(`${ORIGIN}/api/health?deep`));
    expect(deep.status).toBe(503);
    expect(await deep.json()).toMatchObject({ ok: false, parts: { storage: 'alarm', database: 'good' } });
    expect((await GET(new Request(`${ORIGIN}/api/health`))).status).toBe(200);
  });
});

describe('a database that is shut', () => {
  test('is an alarm and 503 both ways, without a word of why', async () => {
    house.services.database.close();
    expect(await look('database')).toMatchObject({ state: 'alarm' });
    for (const path of ['/api/health', '/api/health?deep']) {
      const answer = await GET(new Request(ORIGIN + path));
      expect(answer.status).toBe(503);
      expect(await answer.text()).not.toMatch(/SQL|closed|libsql/i);
    }
  });
});

describe('the outbox', () => {
  test('that waits long wants a look, and what was set aside wants it now', async () => {
    await waits(60_000);
    expect(await look('outbox')).toMatchObject({ state: 'good' });
    await waits(660_000);
    expect(await look('outbox')).toMatchObject({ state: 'care' });
    await waits(1000, { deadAt: 1 });
    const part = await look('outbox');
    expect(part).toMatchObject({ state: 'alarm' });
    expect(part.figures).toEqual([{ term: 'mail', value: '2 waiting, 1 set aside' }]);
  });
});

describe('the sweep', () => {
  test('that stands still or failed is an alarm', async () => {
    expect(await look('sweep')).toMatchObject({ state: 'good' });
    beat('sweep', house.clock.now(), false);
    expect(await look('sweep')).toMatchObject({
      state: 'alarm',
      sentence: expect.stringContaining('failed'),
    });
    beat('sweep', house.clock.now(), true);
    expect(await look('sweep')).toMatchObject({ state: 'good' });
    house.clock.advance(200_000);
    expect(await look('sweep')).toMatchObject({
      state: 'alarm',
      sentence: expect.stringContaining('stands still'),
    });
  });
});

describe('tree heads', () => {
  test('that stay behind the log want a look, and the next head ends it', async () => {
    await happens();
    expect(await look('heads')).toMatchObject({ state: 'good' });
    house.clock.advance(360_000);
    expect(await look('heads')).toMatchObject({ state: 'care' });
    house.clock.advance(600_000);
    expect(await look('heads')).toMatchObject({ state: 'alarm' });
    await tendHeads(house.services);
    await tendHeads(house.services);
    expect(await look('heads')).toMatchObject({ state: 'good' });
  });
});

describe('clocks', () => {
  const addDevices = async (offsetsMs: number[]) =>
    house.services.write(async (tx) => {
      const now = house.clock.now();
      await tx.insert(deviceModel).values({
        id: 'm',
        maker: 'Any',
        name: 'Any',
        sampleRatesHz: [],
        bitDepths: [],
        mediaTypes: [],
        longestClipSeconds: 1,
        checkIntervalDays: 1,
        createdAt: now,
      });
      for (const [n, clockOffsetMs] of offsetsMs.entries())
        await tx.insert(device).values({
          id: `d-${n}`,
          assetTag: `HM-${n}`,
          serialNumber: `S-${n}`,
          modelId: 'm',
          state: 'in-service',
          lastHeardAt: now,
          clockOffsetMs,
          createdAt: now,
        });
    });

  test('of a device that is far off name it, the farthest first', async () => {
    await addDevices([0, 10_000, -400_000, 900_000, 0, 0]);
    const part = await look('clocks');
    expect(part.state).toBe('care');
    expect(part.figures.map(({ term }) => term)).toEqual(['HM-3', 'HM-2']);
  });

  test('that are off for most devices point to our own', async () => {
    await addDevices([400_000, 401_000, 402_000, 400_500, 0]);
    expect(await look('clocks')).toMatchObject({
      state: 'alarm',
      sentence: expect.stringContaining('this server first'),
    });
  });
});

test('analysis that falls behind wants a look', async () => {
  expect(await look('pool', { size: 2, busy: 2, waiting: 5 })).toMatchObject({ state: 'care' });
  expect(await look('pool', { size: 2, busy: 2, waiting: 21 })).toMatchObject({ state: 'alarm' });
});
