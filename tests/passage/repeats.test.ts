import { createHash } from 'node:crypto';
import { and, eq, isNull, sql } from 'drizzle-orm';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { custodyEntry, custodySubject, filing, recording } from '@/db/schema';
import { sendRecording } from '@/devices/agent/upload';
import type { SlotAnswer } from '@/lib/contract/device';
import { ingestServices } from '@/lib/http/passage';
import { sweepRecordings } from '@/lib/ingest/sweep';
import { chestWav, clean, clipOf, openPassageHouse, type PassageHouse } from '../support/passageHouse';

let house: PassageHouse;
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(() => house.close());

const sha = (bytes: Uint8Array) => createHash('sha256').update(bytes).digest('hex');
const slotBody = (bytes: Uint8Array, number: string, more = {}) => ({
  recordingNumber: number,
  sha256: sha(bytes),
  bytes: bytes.length,
  mediaType: 'audio/wav',
  recordedAt: Date.now(),
  deviceTime: Date.now(),
  ...more,
});
const put = (slot: SlotAnswer, bytes: Uint8Array, headers = slot.upload?.headers ?? {}) => {
  const { 'content-length': _length, host: _host, ...rest } = headers as Record<string, string>;
  return fetch(slot.upload?.url ?? '', {
    method: 'PUT',
    headers: rest,
    body: bytes as Uint8Array<ArrayBuffer>,
  });
};
const entriesOf = async (number: string) => {
  const rows = await house.services.read
    .select({ kind: custodyEntry.kind })
    .from(recording)
    .innerJoin(
      custodySubject,
      and(eq(custodySubject.subjectKind, 'recording'), eq(custodySubject.subjectId, recording.id)),
    )
    .innerJoin(custodyEntry, eq(custodyEntry.sequence, custodySubject.sequence))
    .where(eq(recording.number, number))
    .orderBy(custodyEntry.sequence);
  return rows.map((row) => row.kind);
};

test('a slot asked for again with the same number is the same recording, with a fresh address', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 11);
  const body = slotBody(bytes, 'again');
  const first = await agent.call<SlotAnswer>('/api/device/v1/recordings', body);
  const second = await agent.call<SlotAnswer>('/api/device/v1/recordings', {
    ...body,
    deviceTime: Date.now() + 5,
  });
  expect(second).toMatchObject({ recording: first.recording, repeated: true });
  expect(second.upload).not.toBeNull();
});

test('the same number with other content is refused, the first is kept, and an entry says so', async () => {
  const { agent } = await house.enrolled();
  const first = await agent.call<SlotAnswer>(
    '/api/device/v1/recordings',
    slotBody(chestWav(clean(), 12), 'taken'),
  );
  await expect(
    agent.call('/api/device/v1/recordings', slotBody(chestWav(clean(), 13), 'taken')),
  ).rejects.toMatchObject({ status: 409, code: 'recording-conflict' });
  expect(await entriesOf(first.recording)).toEqual(['slot-issued', 'slot-refused']);
});

test('completing again gives the same answer and writes nothing', async () => {
  const { agent } = await house.enrolled();
  const clip = clipOf(chestWav(clean(), 14));
  const first = await sendRecording(agent, clip);
  const again = await sendRecording(agent, clip);
  expect(again.answer).toEqual(first.answer);
});

test('ten completions at once are one passage', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 15);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'ten'));
  expect((await put(slot, bytes)).status).toBe(200);
  const answers = await Promise.all(
    Array.from({ length: 10 }, () => agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {})),
  );
  expect(new Set(answers.map((answer) => JSON.stringify(answer))).size).toBe(1);
  expect(await entriesOf(slot.recording)).toEqual([
    'slot-issued',
    'received',
    'sealed',
    'measured',
    'put-in-tray',
  ]);
});

test('completing before the bytes are there is told so, and goes well afterwards', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 16);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'early'));
  await expect(agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {})).rejects.toMatchObject({
    code: 'bytes-missing',
  });
  await put(slot, bytes);
  await expect(agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {})).resolves.toMatchObject(
    { verdict: 'usable' },
  );
});

test('storage refuses other bytes, another length and another type through the presigned address', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 17);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'exactly'));
  const other = bytes.slice();
  other[100] = (other[100] ?? 0) ^ 1;
  expect((await put(slot, other)).status).toBeGreaterThanOrEqual(400);
  expect((await put(slot, bytes.slice(0, -2))).status).toBeGreaterThanOrEqual(400);
  expect(
    (await put(slot, bytes, { ...slot.upload?.headers, 'content-type': 'text/html' })).status,
  ).toBeGreaterThanOrEqual(400);
  expect((await put(slot, bytes)).status).toBe(200);
  expect((await put(slot, bytes)).status).toBe(412);
});

test('bytes that are not the announced ones are quarantined by ingestion itself, where a store did not look', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 18);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'lying'));
  const [row] = await house.services.read
    .select()
    .from(recording)
    .where(eq(recording.number, slot.recording));
  const other = chestWav(clean(), 19);
  await house.services.storage.put({ key: row?.slotKey ?? '', body: other, contentType: 'audio/wav' });
  for (let i = 0; i < 2; i++)
    await expect(
      agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {}),
    ).rejects.toMatchObject({ status: 422, code: 'bytes-mismatch' });
  expect(await entriesOf(slot.recording)).toEqual(['slot-issued', 'bytes-quarantined']);
  expect(
    Buffer.from(await house.services.storage.getBytes(`quarantine/${row?.id}/${sha(other)}`, 1e7)).equals(
      Buffer.from(other),
    ),
  ).toBe(true);
});

test('a put through the still valid address after sealing changes nothing that is sealed', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 20);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'late'));
  await put(slot, bytes);
  await agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {});
  await put(slot, bytes);
  const [row] = await house.services.read
    .select()
    .from(recording)
    .where(eq(recording.number, slot.recording));
  expect(sha(await house.services.storage.getBytes(row?.originalKey ?? '', 1e7))).toBe(sha(bytes));
});

// A process may die after any committed step; what it leaves is put together here by hand.
test.each(['received', 'sealed'] as const)(
  'a passage that died after "%s" is carried on by the next call',
  async (stage) => {
    const { agent } = await house.enrolled();
    const bytes = chestWav(clean(), stage === 'received' ? 21 : 22);
    const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, `died-${stage}`));
    await put(slot, bytes);
    const { storage, write, read } = house.services;
    const [row] = await read.select().from(recording).where(eq(recording.number, slot.recording));
    if (!row) throw new Error('no row');
    if (stage === 'sealed') {
      const head = await storage.head(row.slotKey);
      const key = `originals/${row.id}/${row.declaredSha256}`;
      await storage.seal({
        from: row.slotKey,
        to: key,
        retainUntilMs: Date.now() + 86_400_000,
        contentType: row.mediaType,
        expectedEtag: head?.etag ?? '',
        contentLength: bytes.length,
      });
      await write(async (tx) => {
        await tx
          .update(recording)
          .set({
            stage,
            receivedAt: Date.now(),
            sealedAt: Date.now(),
            originalKey: key,
            lockKind: 'compliance',
          })
          .where(eq(recording.id, row.id));
      });
      await storage.remove(row.slotKey);
    } else {
      await write(async (tx) => {
        await tx.update(recording).set({ stage, receivedAt: Date.now() }).where(eq(recording.id, row.id));
      });
    }
    await expect(
      agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {}),
    ).resolves.toMatchObject({ verdict: 'usable', stage: 'measured' });
  },
);

test('the sweep carries a clip on whose device never came back', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 23);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'silent'));
  await put(slot, bytes);
  house.clock.advance(120_000);
  expect(await sweepRecordings(ingestServices(house.services))).toBeGreaterThanOrEqual(1);
  const [row] = await house.services.read
    .select()
    .from(recording)
    .where(eq(recording.number, slot.recording));
  expect(row?.stage).toBe('measured');
});

test('a store that fails while the clip is read loses nothing: the call says when to repeat, and the repeat goes well', async () => {
  const { agent } = await house.enrolled();
  const bytes = chestWav(clean(), 24);
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'store-down'));
  await put(slot, bytes);
  const broken = {
    ...house.services.storage,
    getStream: () => house.services.storage.getStream('nowhere-at-all'),
  };
  const services = {
    ...ingestServices(house.services),
    storage: {
      ...broken,
      getStream: async () => ({
        ...(await house.services.storage.getStream((await slotKey(slot)) ?? '')),
        body: cut(),
      }),
    },
  };
  const { carryOn } = await import('@/lib/ingest/completeRecording');
  const [row] = await house.services.read
    .select()
    .from(recording)
    .where(eq(recording.number, slot.recording));
  await expect(carryOn(services, row?.id ?? '')).rejects.toMatchObject({ code: 'storage-unavailable' });
  await expect(agent.call(`/api/device/v1/recordings/${slot.recording}/complete`, {})).resolves.toMatchObject(
    { verdict: 'usable' },
  );
});

async function slotKey(slot: SlotAnswer) {
  const [row] = await house.services.read
    .select({ key: recording.slotKey })
    .from(recording)
    .where(eq(recording.number, slot.recording));
  return row?.key;
}
async function* cut(): AsyncGenerator<Uint8Array> {
  const { StorageError } = await import('@/lib/storage/port');
  yield new Uint8Array(100);
  throw new StorageError('unavailable', 'getStream', 'cut');
}

test('no recording is ever filed twice at the same time', async () => {
  const [row] = await house.services.read
    .select({ n: sql<number>`max(n)` })
    .from(
      sql`(select count(*) as n from ${filing} where ${isNull(filing.supersededAt)} group by recording_id)`,
    );
  expect(row?.n ?? 0).toBeLessThanOrEqual(1);
});
