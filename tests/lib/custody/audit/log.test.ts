import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { makeHead } from '@/lib/custody/heads/makeHead';
import { bringTreeUp } from '@/lib/custody/tree/grow';
import { headSigner } from '@/lib/http/treeHeads';
import {
  type AuditedHouse,
  audit,
  type Copy,
  copyOf,
  openAuditedHouse,
  rewrite,
  sizeOf,
  textAt,
} from '@/tests/support/auditedHouse';

let audited: AuditedHouse;
let copy: Copy;
/** A middle entry that is inside every head. */
let middle: number;
let last: number;
beforeAll(async () => {
  audited = await openAuditedHouse(3);
  middle = (audited.sizes[0] ?? 0) + 2;
  last = (audited.sizes[2] ?? 0) - 1;
});
afterAll(() => audited.close());
beforeEach(async () => {
  copy = await copyOf(audited);
});
afterEach(() => copy.close());

const rebuild = async () => {
  await copy.sql('delete from custody_node');
  await bringTreeUp(copy.services);
};
/** Move the rows from one on by a number of places. */
const shift = async (from: number, by: number) => {
  await copy.sql('update custody_entry set sequence = -sequence - 1000 where sequence >= ?', [from]);
  await copy.sql('update custody_entry set sequence = -(sequence + 1000) + ? where sequence < 0', [by]);
  await copy.sql('update custody_subject set sequence = sequence + ? where sequence >= ?', [
    by + 100_000,
    from,
  ]);
  await copy.sql('update custody_subject set sequence = sequence - 100000 where sequence >= 100000');
};
const renumber = async (from: number, to: number) => {
  for (let i = from; i <= to; i++)
    await rewrite(copy, i, (await textAt(copy, i)).replace(/"sequence":\d+/, `"sequence":${i}`), true);
};

test('an untouched house is found whole, from its entries up to its originals', async () => {
  const result = await audit(audited.house.services);
  expect(result.findings).toEqual([]);
  expect(result).toMatchObject({
    ok: true,
    entries: last + 1,
    heads: { database: 3, storage: 3, mail: 0 },
    objects: { originals: 3, lockedOriginals: 3, derived: 6 },
  });
  expect((await copy.audit()).ok).toBe(true);
});

describe('an entry', () => {
  test('that was edited is named by its number', async () => {
    await rewrite(copy, middle, (await textAt(copy, middle)).replace('service', 'Service'), false);
    const { findings, ok } = await copy.audit();
    expect(ok).toBe(false);
    expect(findings).toContainEqual(expect.objectContaining({ code: 'entry-edited', sequence: middle }));
    expect(findings).toContainEqual(expect.objectContaining({ code: 'tree-differs' }));
  });

  test('that was edited together with its leaf hash is found by its subtree', async () => {
    await rewrite(copy, middle, (await textAt(copy, middle)).replace('"label":"', '"label":"x'), true);
    const { findings } = await copy.audit();
    const pair = middle - (middle % 2);
    expect(findings).toContainEqual(expect.objectContaining({ code: 'entry-edited', sequence: pair }));
    expect(findings).toContainEqual(
      expect.objectContaining({ code: 'tree-differs', sequence: audited.sizes[0], size: audited.sizes[1] }),
    );
  });

  test('that was edited with every hash above it made anew is found by the heads', async () => {
    await rewrite(copy, middle, (await textAt(copy, middle)).replace('"label":"', '"label":"x'), true);
    await rebuild();
    const { findings, codes } = await copy.audit();
    expect(codes).toEqual(['tree-replaced']);
    expect(findings[0]).toMatchObject({ sequence: audited.sizes[0], size: audited.sizes[1] });
  });

  test('that was removed leaves a gap that is named', async () => {
    await copy.sql('delete from custody_entry where sequence = ?', [middle]);
    const { findings } = await copy.audit();
    expect(findings).toContainEqual(expect.objectContaining({ code: 'entry-removed', sequence: middle }));
  });

  test('that was removed is named though the rows behind it moved up', async () => {
    await copy.sql('delete from custody_entry where sequence = ?', [middle]);
    await copy.sql('delete from custody_subject where sequence = ?', [middle]);
    await shift(middle + 1, -1);
    await rebuild();
    const { findings } = await copy.audit();
    expect(findings).toContainEqual(expect.objectContaining({ code: 'entry-removed', sequence: middle }));
  });

  test('that was removed is found by the heads though everything behind it was numbered and hashed anew', async () => {
    await copy.sql('delete from custody_entry where sequence = ?', [middle]);
    await copy.sql('delete from custody_subject where sequence = ?', [middle]);
    await shift(middle + 1, -1);
    await renumber(middle, last - 1);
    await rebuild();
    const { codes } = await copy.audit();
    expect(codes).toContain('tree-replaced');
    expect(codes).toContain('tail-cut');
  });

  test('that was put in is named', async () => {
    const text = await textAt(copy, middle);
    await shift(middle, 1);
    await copy.sql(
      `insert into custody_entry select ?, at, kind, actor_kind, actor_id, canonical, leaf_hash from custody_entry where sequence = ?`,
      [middle, middle + 1],
    );
    await rewrite(copy, middle, text.replace('"label":"', '"label":"x'), true);
    await rebuild();
    const { findings } = await copy.audit();
    expect(findings).toContainEqual(
      expect.objectContaining({ code: 'entry-inserted', sequence: middle + 1 }),
    );
  });

  test('that changed places with its neighbour is named', async () => {
    await copy.sql('update custody_entry set sequence = -1 where sequence = ?', [middle]);
    await copy.sql('update custody_entry set sequence = ? where sequence = ?', [middle, middle + 1]);
    await copy.sql('update custody_entry set sequence = ? where sequence = -1', [middle + 1]);
    const { findings } = await copy.audit();
    expect(findings).toContainEqual(expect.objectContaining({ code: 'entry-moved', sequence: middle + 1 }));
  });

  test('that is no JSON any more is named', async () => {
    await rewrite(copy, middle, '{"half', true);
    expect((await copy.audit()).findings).toContainEqual(
      expect.objectContaining({ code: 'entry-unreadable', sequence: middle }),
    );
  });

  test('whose searched columns were changed is named', async () => {
    await copy.sql(`update custody_entry set actor_id = 'somebody else' where sequence = ?`, [middle]);
    const { codes, findings } = await copy.audit();
    expect(codes).toEqual(['columns-changed']);
    expect(findings[0]?.sequence).toBe(middle);
  });

  test('that was hidden from a thread, or put into another, is named', async () => {
    await copy.sql(`delete from custody_subject where subject_kind = 'recording' and sequence = ?`, [middle]);
    const hidden = await copy.audit({ withBytes: false });
    expect(hidden.findings).toContainEqual(
      expect.objectContaining({ code: 'thread-changed', sequence: middle }),
    );
    await copy.sql(`insert into custody_subject values ('patient', 'p', ?)`, [middle + 1]);
    expect((await copy.audit({ withBytes: false })).findings).toContainEqual(
      expect.objectContaining({ code: 'thread-changed', sequence: middle + 1 }),
    );
  });

  test('that is dated an hour before the one in front of it is named', async () => {
    await copy.services.write((tx) =>
      appendEntries(tx, audited.house.clock.now() - 3_600_000, [
        { kind: 'log-opened', actor: SERVICE_ACTOR, subjects: [] },
      ]),
    );
    const { codes, findings } = await copy.audit();
    expect(codes).toEqual(['clock-set-back']);
    expect(findings[0]?.sequence).toBe(last + 1);
  });
});

describe('the tree', () => {
  test('a stored subtree that was changed is named, and the entries that a locked head vouches for are not accused', async () => {
    await copy.sql('update custody_node set hash = zeroblob(32) where level = 1 and position = 1');
    await copy.sql('update custody_node set hash = zeroblob(32) where level = 2 and position = 2');
    const { codes, findings } = await copy.audit();
    expect(codes).toEqual(['subtree-changed']);
    expect(findings.map(({ sequence }) => sequence).sort((a = 0, b = 0) => a - b)).toEqual([2, 8]);
  });

  test('a stored subtree that is gone is named', async () => {
    await copy.sql('delete from custody_node where level = 1 and position = 1');
    expect((await copy.audit()).findings).toContainEqual(
      expect.objectContaining({ code: 'subtree-missing', sequence: 2 }),
    );
  });

  test('a tail that was cut is named by what is left of the tree, and by the heads', async () => {
    await copy.sql('delete from custody_entry where sequence >= ?', [middle]);
    await copy.sql('delete from custody_subject where sequence >= ?', [middle]);
    const { findings } = await copy.audit({ withBytes: false });
    expect(findings).toContainEqual(expect.objectContaining({ code: 'tail-cut', sequence: middle }));
  });

  test('a tail that was cut with its subtrees and the heads over it is an older database than storage knows', async () => {
    for (const table of ['custody_entry', 'custody_subject'])
      await copy.sql(`delete from ${table} where sequence >= ?`, [middle]);
    await copy.sql('delete from custody_head where size > ?', [middle]);
    await rebuild();
    const { findings } = await copy.audit({ withBytes: false });
    expect(findings).toContainEqual(
      expect.objectContaining({ code: 'database-restored', sequence: middle, size: last + 1 }),
    );
  });
});

describe('a database of yesterday', () => {
  /** As it was when the first head was made. */
  const yesterday = async () => {
    const size = audited.sizes[0] ?? 0;
    for (const table of ['custody_entry', 'custody_subject'])
      await copy.sql(`delete from ${table} where sequence >= ?`, [size]);
    await copy.sql('delete from custody_head where size > ?', [size]);
    await rebuild();
  };
  const goOn = async (count: number) => {
    await copy.services.write((tx) =>
      appendEntries(
        tx,
        audited.house.clock.now(),
        Array.from({ length: count }, () => ({
          kind: 'log-opened' as const,
          actor: SERVICE_ACTOR,
          subjects: [],
        })),
      ),
    );
    await makeHead(copy.services, await headSigner(copy.services));
  };

  test('that was put back is said to lack what storage knows', async () => {
    await yesterday();
    expect((await copy.audit({ withBytes: false })).codes).toContain('database-restored');
  });

  test('that was put back and went on with other entries is still said to be one', async () => {
    await yesterday();
    await goOn(last + 40);
    const { findings } = await copy.audit({ withBytes: false });
    expect(findings).toContainEqual(
      expect.objectContaining({ code: 'database-restored', sequence: audited.sizes[0] }),
    );
    expect(await sizeOf(copy.services)).toBeGreaterThan(last);
  });
});
