import { type Client, createClient } from '@libsql/client';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { type FreshDatabase, freshDatabase } from '@/tests/support/database';

/** The tree, its heads and what is asked of it, against somebody with the file in hand. */
let fresh: FreshDatabase;
let stranger: Client;

const ROWS = [
  `insert into custody_head (size, root, note, kid, made_at) values (2, zeroblob(32), 'note', 'k', 1)`,
  `insert into custody_head_mail (day, size, recipients, made_at) values ('2026-12-01', 2, 1, 1)`,
  `insert into user (id, name, email, created_at, updated_at) values ('u', 'U', 'u@example.org', 1, 1), ('v', 'V', 'v@example.org', 1, 1)`,
  `insert into device_model (id, maker, name, sample_rates_hz, bit_depths, media_types, longest_clip_seconds, check_interval_days, created_at)
   values ('m', 'maker', 'model', '[4000]', '[16]', '["audio/wav"]', 60, 365, 1)`,
  `insert into device (id, asset_tag, serial_number, model_id, state, created_at) values ('d', 'HM-1', 's1', 'm', 'in-service', 1)`,
  `insert into recording (id, number, device_id, model_id, device_recording_number, stage, declared_sha256, declared_bytes, media_type, recorded_at_device, recorded_at, clock_offset_ms, request_hash, slot_key, slot_expires_at, awaited_at)
   values ('r', 'r', 'd', 'm', 'r', 'awaited', 'b', 1, 'audio/wav', 1, 1, 0, 'h', 'k', 1, 1)`,
  `insert into evidence_request (id, recording_id, reason, asked_by, asked_at) values ('q', 'r', 'why', 'u', 1)`,
  `insert into evidence_policy (version, second_person, made_at) values (1, 1, 1)`,
];

beforeEach(async () => {
  fresh = await freshDatabase();
  await fresh.database.write((tx) =>
    appendEntries(
      tx,
      1,
      Array.from({ length: 5 }, () => ({ kind: 'log-opened' as const, actor: SERVICE_ACTOR, subjects: [] })),
    ),
  );
  for (const row of ROWS) await fresh.database.writer.execute(row);
  stranger = createClient({ url: `file:${fresh.file}` });
  await stranger.execute('pragma recursive_triggers = off');
});
afterEach(async () => {
  stranger.close();
  await fresh.close();
});

const TABLES = ['custody_node', 'custody_head', 'custody_head_mail', 'evidence_request', 'evidence_policy'];
const contents = async () =>
  JSON.stringify(
    await Promise.all(
      TABLES.map(async (table) => (await fresh.database.client.execute(`select * from ${table}`)).rows),
    ),
    (_, value: unknown) => (value instanceof ArrayBuffer ? Buffer.from(value).toString('hex') : value),
  );

const ATTACKS: [string, string][] = [
  ['a subtree is changed', `update custody_node set hash = zeroblob(32) where level = 1`],
  ['a subtree is moved', `update custody_node set position = 9 where level = 2`],
  ['a subtree is removed', `delete from custody_node where level = 2`],
  ['a subtree is replaced', `replace into custody_node (level, position, hash) values (1, 0, zeroblob(32))`],
  ['a subtree is put in with a gap', `insert into custody_node values (1, 5, zeroblob(32))`],
  ['a subtree is put in below the leaves', `insert into custody_node values (0, 0, zeroblob(32))`],
  ['a subtree of another length is put in', `insert into custody_node values (1, 2, zeroblob(20))`],
  ['a head is changed', `update custody_head set root = zeroblob(32), note = 'other' where size = 2`],
  ['a head is removed', `delete from custody_head`],
  [
    'a head is replaced',
    `replace into custody_head (size, root, note, kid, made_at) values (2, zeroblob(32), 'other', 'k', 1)`,
  ],
  [
    'a head of a smaller tree follows',
    `insert into custody_head (size, root, note, kid, made_at) values (1, zeroblob(32), 'n', 'k', 1)`,
  ],
  [
    'a head is made of more than the log holds',
    `insert into custody_head (size, root, note, kid, made_at) values (6, zeroblob(32), 'n', 'k', 1)`,
  ],
  ['a letter of heads is forgotten', `delete from custody_head_mail`],
  ['a letter of heads is dated otherwise', `update custody_head_mail set day = '2026-12-02'`],
  ['a request for evidence is removed', `delete from evidence_request`],
  ['a request for evidence is replaced', `replace into evidence_request select * from evidence_request`],
  ['the reason of a request is changed', `update evidence_request set reason = 'better'`],
  [
    'somebody approves what they asked for',
    `update evidence_request set decision = 'approved', decided_by = 'u', decided_at = 2`,
  ],
  ['a policy is changed', `update evidence_policy set second_person = 0`],
  ['a policy is replaced', `replace into evidence_policy (version, second_person, made_at) values (1, 0, 1)`],
  ['a policy is removed', `delete from evidence_policy`],
];

describe.each(['our own connection', 'a connection without our pragmas'] as const)('on %s', (whose) => {
  test.each(ATTACKS)('it is refused that %s', async (_, statement) => {
    const client = whose === 'our own connection' ? fresh.database.writer : stranger;
    const before = await contents();
    await expect(client.executeMultiple(statement)).rejects.toThrow();
    expect(await contents()).toBe(before);
  });
});

test('a request for evidence is decided by somebody else, once', async () => {
  const { writer } = fresh.database;
  await writer.execute(
    `update evidence_request set decision = 'approved', decided_by = 'v', decided_at = 2 where id = 'q'`,
  );
  await expect(
    writer.execute(`update evidence_request set decision = 'refused', decided_at = 3 where id = 'q'`),
  ).rejects.toThrow('decided once');
});
