import { asc, sql } from 'drizzle-orm';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { custodyEntry, custodyNode } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import type { NewEntry } from '@/lib/custody/entry';
import { hex } from '@/lib/custody/pure/hash';
import { bringTreeUp } from '@/lib/custody/tree/grow';
import { leafHashNow } from '@/lib/custody/tree/hashes';
import { consistencyProof, inclusionProofs, rootAt } from '@/lib/custody/tree/prove';
import { naiveConsistency, naiveInclusion, naiveRoot } from '@/tests/support/naiveTree';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
beforeEach(async () => {
  house = await openHouse();
});
afterEach(() => house.close());

const entry = (id: string): NewEntry => ({
  kind: 'heard',
  actor: { kind: 'person', id: 'p', label: 'Dr P' },
  subjects: [{ kind: 'recording', id }],
});
const append = (count: number, name = 'r') =>
  house.services.write((tx) =>
    appendEntries(
      tx,
      house.clock.now(),
      Array.from({ length: count }, (_, i) => entry(`${name}${i}`)),
    ),
  );

/** Entries as a version without a tree wrote them. */
const appendOldWay = (count: number) =>
  house.services.write(async (tx) => {
    const [row] = await tx
      .select({ next: sql<number>`coalesce(max(${custodyEntry.sequence}) + 1, 0)` })
      .from(custodyEntry);
    for (let i = 0; i < count; i++) {
      const sequence = (row?.next ?? 0) + i;
      const canonical = `{"sequence":${sequence}}`;
      await tx.insert(custodyEntry).values({
        sequence,
        at: 1,
        kind: 'heard',
        actorKind: 'service',
        actorId: 'x',
        canonical,
        leafHash: leafHashNow(canonical),
      });
    }
  });

const leavesOf = async () =>
  (
    await house.services.read
      .select({ hash: custodyEntry.leafHash })
      .from(custodyEntry)
      .orderBy(asc(custodyEntry.sequence))
  ).map(({ hash }) => hash);
const nodeCount = async () => (await house.services.read.select().from(custodyNode)).length;

/** Every proof of the log as it stands, against the definition. */
async function expectWholeTree(): Promise<void> {
  const leaves = await leavesOf();
  const { read } = house.services;
  expect(hex(await rootAt(read, leaves.length))).toBe(hex(naiveRoot(leaves)));
  let complete = 0;
  for (let width = 2; width <= leaves.length; width *= 2) complete += Math.floor(leaves.length / width);
  expect(await nodeCount()).toBe(complete);
  for (const size of new Set([1, 2, 3, Math.ceil(leaves.length / 2), leaves.length - 1, leaves.length])) {
    if (size < 1 || size > leaves.length) continue;
    const tree = leaves.slice(0, size);
    const proofs = await inclusionProofs(
      read,
      tree.map((_, i) => i),
      size,
    );
    for (const [i, proof] of proofs.entries()) {
      expect(proof.leafHash).toBe(hex(tree[i] as Uint8Array));
      expect(proof.path).toEqual(naiveInclusion(i, tree).map(hex));
    }
    for (let from = 1; from <= size; from++)
      expect((await consistencyProof(read, from, size)).path).toEqual(naiveConsistency(from, tree).map(hex));
  }
}

test('entries appended one by one and in batches of any length stand in one tree', async () => {
  for (const count of [1, 1, 1, 2, 3, 1, 8, 5, 16, 1]) {
    await append(count);
    await expectWholeTree();
  }
});

test('an append whose transaction fails leaves no subtree behind', async () => {
  await append(5);
  const before = await nodeCount();
  await expect(
    house.services.write(async (tx) => {
      await appendEntries(tx, 1, [entry('lost'), entry('lost'), entry('lost')]);
      throw new Error('no');
    }),
  ).rejects.toThrow('no');
  expect(await nodeCount()).toBe(before);
  await append(3);
  await expectWholeTree();
});

test('a log from before the tree is brought up, and bringing it up again makes nothing', async () => {
  await appendOldWay(1_003);
  expect(await bringTreeUp(house.services)).toBeGreaterThan(990);
  expect(await bringTreeUp(house.services)).toBe(0);
  await append(3);
  const leaves = await leavesOf();
  expect(hex(await rootAt(house.services.read, leaves.length))).toBe(hex(naiveRoot(leaves)));
});

test('an entry appended before the tree was brought up brings it up itself', async () => {
  await appendOldWay(13);
  await append(1);
  await expectWholeTree();
});

test('entries that an older version appends in between are taken in by the next append', async () => {
  await append(6);
  await appendOldWay(5);
  await append(2);
  await expectWholeTree();
});

test('the tree brought up twice at once, while entries arrive, has each subtree once', async () => {
  await appendOldWay(300);
  await Promise.all([bringTreeUp(house.services), append(3), bringTreeUp(house.services)]);
  await expectWholeTree();
});

test('what the log does not reach has no proof', async () => {
  await append(4);
  const { read } = house.services;
  await expect(inclusionProofs(read, [4], 5)).rejects.toMatchObject({ code: 'not-found' });
  await expect(inclusionProofs(read, [3], 3)).rejects.toMatchObject({ code: 'not-found' });
  await expect(inclusionProofs(read, [0], 5)).rejects.toMatchObject({ code: 'not-found' });
  await expect(consistencyProof(read, 2, 5)).rejects.toMatchObject({ code: 'not-found' });
  await expect(consistencyProof(read, 4, 5)).rejects.toMatchObject({ code: 'not-found' });
  await expect(consistencyProof(read, 0, 4)).rejects.toMatchObject({ code: 'not-found' });
});
