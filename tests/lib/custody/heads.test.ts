import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { custodyHead, custodyHeadMail, outbox, policyVersion, signingKey } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { verifierLines } from '@/lib/custody/heads/headKeys';
import { mailHeads } from '@/lib/custody/heads/mailHeads';
import { makeHead } from '@/lib/custody/heads/makeHead';
import { HEADS_PREFIX, headKey, lockedHead, storeHead } from '@/lib/custody/heads/storeHead';
import { hex } from '@/lib/custody/pure/hash';
import { findHeads, readHead, verifyHead } from '@/lib/custody/pure/head';
import { parseVerifier } from '@/lib/custody/pure/note';
import { logSize } from '@/lib/custody/readThread';
import { rootAt } from '@/lib/custody/tree/prove';
import { headSigner, headWork, tendHeads } from '@/lib/http/treeHeads';
import { runOutboxOnce } from '@/lib/platform/outbox';
import { addPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

const HOUR_MS = 3_600_000;
let house: House;
beforeEach(async () => {
  house = await openHouse({ storage: true });
});
afterEach(() => house.close());

const append = (count = 1) =>
  house.services.write((tx) =>
    appendEntries(
      tx,
      house.clock.now(),
      Array.from({ length: count }, () => ({
        kind: 'log-opened' as const,
        actor: SERVICE_ACTOR,
        subjects: [],
      })),
    ),
  );
const make = async () => makeHead(house.services, await headSigner(house.services));
const made = async () => {
  const head = await make();
  if (!head) throw new Error('no head was made');
  return head;
};
const work = () =>
  runOutboxOnce(house.services, { mail: async () => undefined, ...headWork(house.services) });
const trusted = async () =>
  await Promise.all((await verifierLines(house.services)).map((line) => parseVerifier(line)));

test('a head is signed over the log as it stands, by a key of its own, and verifies with the published line', async () => {
  await append(5);
  const head = await made();
  const size = await logSize(house.services);
  const read = await verifyHead(head.note, house.services.env.BELLKEEP_CUSTODY_ORIGIN, await trusted());
  expect(read.size).toBe(size);
  expect(hex(read.root)).toBe(hex(await rootAt(house.services.read, size)));
  const keys = await house.services.read.select().from(signingKey);
  expect(keys.map((key) => key.use)).toEqual(['tree-head']);
  expect(keys[0]?.sealedPrivateJwk.startsWith('v1.')).toBe(true);
});

test('no second head is made until something is appended', async () => {
  await append();
  await made();
  expect(await make()).toBeNull();
  await append();
  expect((await made()).size).toBe(await logSize(house.services));
});

test('of two that sign at the same moment one wins, and one piece of work keeps its head', async () => {
  await append(3);
  await headSigner(house.services);
  const both = await Promise.all([make(), make()]);
  expect(both.filter((head) => head !== null)).toHaveLength(1);
  expect(await house.services.read.select().from(outbox)).toHaveLength(1);
});

test('nothing is signed over a log that was changed behind the last head', async () => {
  await append(4);
  await made();
  const { writer } = house.services.database;
  await writer.execute('drop trigger custody_node_no_update');
  await writer.execute('update custody_node set hash = zeroblob(32) where level = 2');
  await append();
  await expect(make()).rejects.toThrow('its head says');
});

test('a head lies under lock in storage after the outbox ran, once and again', async () => {
  await append(2);
  const head = await made();
  await work();
  await storeHead(house.services, { size: head.size });
  const kept = await lockedHead(house.services, head);
  expect(kept?.note).toBe(head.note);
  expect(kept?.retainUntilMs).toBeGreaterThan(house.clock.now() + 8 * 365 * 24 * HOUR_MS);
  await expect(house.services.storage.remove(headKey(head))).rejects.toMatchObject({ code: 'locked' });
  const { entries } = await house.services.storage.list(HEADS_PREFIX);
  expect(entries).toHaveLength(1);
});

test('a head is locked a year longer than policy keeps originals', async () => {
  const madeAt = house.clock.now();
  await house.services.write(async (tx) => {
    await tx.insert(policyVersion).values({
      kind: 'retention',
      version: 1,
      settings: { originalYears: 30 },
      reason: 'children',
      madeBy: 'somebody',
      madeAt,
    });
  });
  await append();
  const head = await made();
  await work();
  const kept = await lockedHead(house.services, head);
  expect(kept?.retainUntilMs).toBeGreaterThan(madeAt + 30.9 * 365 * 24 * HOUR_MS);
});

test('a head whose storing failed is stored later, and one that was stored though the answer was lost is not doubled', async () => {
  await append();
  const head = await made();
  const broken = {
    ...house.services,
    storage: { ...house.services.storage, put: () => Promise.reject(new Error('away')) },
  };
  await runOutboxOnce(house.services, headWork(broken));
  expect(await lockedHead(house.services, head)).toBeNull();
  // It had happened, but nobody was told.
  await storeHead(house.services, { size: head.size });
  house.clock.advance(HOUR_MS);
  await work();
  expect((await lockedHead(house.services, head))?.note).toBe(head.note);
  const [left] = await house.services.read.select().from(outbox).where(eq(outbox.kind, 'custody-head'));
  expect(left?.doneAt).not.toBeNull();
});

test('a head that the outbox gave up is taken up again', async () => {
  await append();
  const head = await made();
  await house.services.write(async (tx) => {
    await tx.update(outbox).set({ deadAt: house.clock.now(), tries: 12 });
  });
  house.clock.advance(2 * HOUR_MS);
  await tendHeads(house.services);
  await work();
  expect((await lockedHead(house.services, head))?.note).toBe(head.note);
});

test('another head of the same size is kept beside the first and said aloud', async () => {
  await append(3);
  const head = await made();
  const other = { size: head.size, root: new Uint8Array(32).fill(255) };
  await house.services.storage.put({
    key: headKey(other),
    body: Buffer.from('x'),
    contentType: 'text/plain',
  });
  await work();
  expect(house.log.some((line) => line.includes('run the custody audit'))).toBe(true);
});

test('auditors are sent the heads once a day, in the hospital’s day', async () => {
  await addPerson(house, { roles: ['auditor'] });
  await addPerson(house, { roles: ['auditor', 'clinician'] });
  await addPerson(house, { roles: ['clinician'] });
  await append(2);
  const first = await made();
  expect(await mailHeads(house.services)).toBe(2);
  expect(await mailHeads(house.services)).toBeNull();
  await append();
  await made();
  expect(await mailHeads(house.services)).toBeNull();
  house.clock.advance(24 * HOUR_MS);
  await append();
  const last = await made();
  expect(await mailHeads(house.services)).toBe(2);
  await house.deliver();
  expect(house.mail).toHaveLength(4);
  const origin = house.services.env.BELLKEEP_CUSTODY_ORIGIN;
  const sizes = house.mail.map(({ text }) => findHeads(text, origin).map((note) => readHead(note).size));
  expect(sizes[0]).toEqual([first.size]);
  expect(sizes[3]?.at(-1)).toBe(last.size);
  const [key = ''] = await verifierLines(house.services);
  expect(house.mail.every(({ text }) => text.includes(key))).toBe(true);
});

test('two processes write to the auditors once, and a day without a new head brings no letter', async () => {
  await addPerson(house, { roles: ['auditor'] });
  await append();
  await made();
  const both = await Promise.all([mailHeads(house.services), mailHeads(house.services)]);
  expect(both.filter((count) => count !== null)).toEqual([1]);
  house.clock.advance(24 * HOUR_MS);
  expect(await mailHeads(house.services)).toBeNull();
  expect(await house.services.read.select().from(custodyHeadMail)).toHaveLength(1);
});

test('where there is no auditor yet, the letter waits for one', async () => {
  await append();
  await made();
  expect(await mailHeads(house.services)).toBeNull();
  await addPerson(house, { roles: ['auditor'] });
  expect(await mailHeads(house.services)).toBe(1);
});

test('each head is of a larger tree than the one before', async () => {
  for (let i = 0; i < 4; i++) {
    await append(i + 1);
    await made();
  }
  const sizes = (await house.services.read.select().from(custodyHead)).map(({ size }) => size);
  expect(sizes).toEqual([...new Set(sizes)].sort((a, b) => a - b));
});
