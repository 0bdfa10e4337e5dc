import { type Client, createClient } from '@libsql/client';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { type FreshDatabase, freshDatabase } from '@/tests/support/database';

/**
 * Somebody with the file in hand and SQL at their fingertips. The database refuses on our own connections, and on one
 * that was opened without our pragmas; who also drops the triggers is found by the audit, not here.
 */
let fresh: FreshDatabase;
let stranger: Client;

const SEEDS = [
  `insert into device_model (id, maker, name, sample_rates_hz, bit_depths, media_types, longest_clip_seconds, check_interval_days, created_at)
   values ('m', 'maker', 'model', '[4000]', '[16]', '["audio/wav"]', 60, 365, 1)`,
  `insert into device (id, asset_tag, serial_number, model_id, state, created_at) values ('d', 'HM-1', 's1', 'm', 'in-service', 1)`,
  `insert into user (id, name, email, created_at, updated_at) values ('u', 'Somebody', 'u@example.org', 1, 1)`,
];

async function insertRow(client: Client, table: string, row: Record<string, unknown>) {
  const names = Object.keys(row);
  await client.execute({
    sql: `insert into ${table} (${names.map((name) => `"${name}"`).join()}) values (${names.map(() => '?').join()})`,
    args: Object.values(row) as string[],
  });
}

/** A row with something in each column that must hold something, found by asking the database itself. */
async function anyRow(table: string, known: Record<string, unknown>): Promise<Record<string, unknown>> {
  const { rows } = await fresh.database.client.execute(`pragma table_info(${table})`);
  const row: Record<string, unknown> = { ...known };
  for (const { name, type, notnull, dflt_value } of rows) {
    if (String(name) in row || notnull === 0 || dflt_value !== null) continue;
    row[String(name)] = type === 'INTEGER' ? 1 : type === 'REAL' ? 1 : `some ${String(name)}`;
  }
  return row;
}

const RECORDING = {
  device_id: 'd',
  model_id: 'm',
  stage: 'filed',
  declared_sha256: 'a'.repeat(64),
  sealed_at: 5,
  original_key: 'originals/r',
};

beforeEach(async () => {
  fresh = await freshDatabase();
  const { writer, write } = fresh.database;
  for (const statement of SEEDS) await writer.execute(statement);
  await insertRow(writer, 'patient', await anyRow('patient', { id: 'p' }));
  await insertRow(
    writer,
    'encounter',
    await anyRow('encounter', { id: 'e', patient_id: 'p', ward_id: null }),
  );
  for (const id of ['r1', 'r2'])
    await insertRow(
      writer,
      'recording',
      await anyRow('recording', { ...RECORDING, id, number: id, device_recording_number: id }),
    );
  await insertRow(
    writer,
    'filing',
    await anyRow('filing', {
      id: 'f1',
      recording_id: 'r1',
      encounter_id: 'e',
      patient_id: 'p',
      by: 'person',
    }),
  );
  await write((tx) =>
    appendEntries(tx, 1000, [
      { kind: 'log-opened', actor: SERVICE_ACTOR, subjects: [] },
      { kind: 'heard', actor: SERVICE_ACTOR, subjects: [{ kind: 'recording', id: 'r1' }] },
    ]),
  );
  stranger = createClient({ url: `file:${fresh.file}` });
  await stranger.execute('pragma foreign_keys = off');
  await stranger.execute('pragma recursive_triggers = off');
});
afterEach(async () => {
  stranger.close();
  await fresh.close();
});

const TABLES = ['custody_entry', 'custody_subject', 'filing', 'recording', 'device', 'user'];
const contents = async () =>
  JSON.stringify(
    await Promise.all(
      TABLES.map(async (table) => (await fresh.database.client.execute(`select * from ${table}`)).rows),
    ),
    (_, value: unknown) => (value instanceof ArrayBuffer ? Buffer.from(value).toString('hex') : value),
  );

const ENTRY = "'heard', 'person', 'x', '{}', x'00'";
const ATTACKS: [string, string][] = [
  ['an entry is edited', `update custody_entry set canonical = '{}' where sequence = 1`],
  ['an entry is moved in time', 'update custody_entry set at = 1 where sequence = 1'],
  ['an entry gets another number', 'update custody_entry set sequence = 7 where sequence = 1'],
  ['an entry is removed', 'delete from custody_entry where sequence = 1'],
  ['the tail is cut', 'delete from custody_entry where sequence >= 1'],
  ['all entries are removed', 'delete from custody_entry'],
  [
    'an entry is replaced',
    `insert or replace into custody_entry (sequence, at, kind, actor_kind, actor_id, canonical, leaf_hash) values (1, 1, ${ENTRY})`,
  ],
  [
    'an entry is replaced by its row id',
    `replace into custody_entry (rowid, at, kind, actor_kind, actor_id, canonical, leaf_hash) values (1, 1, ${ENTRY})`,
  ],
  [
    'an entry is changed where it conflicts',
    `insert into custody_entry (sequence, at, kind, actor_kind, actor_id, canonical, leaf_hash) values (1, 1, ${ENTRY}) on conflict (sequence) do update set canonical = '{}'`,
  ],
  [
    'an entry is put in front',
    `insert into custody_entry (sequence, at, kind, actor_kind, actor_id, canonical, leaf_hash) values (-1, 1, ${ENTRY})`,
  ],
  [
    'an entry is put in with a gap',
    `insert into custody_entry (sequence, at, kind, actor_kind, actor_id, canonical, leaf_hash) values (3, 1, ${ENTRY})`,
  ],
  ['a subject is taken out of a thread', `delete from custody_subject where subject_id = 'r1'`],
  ['a thread is given to somebody else', `update custody_subject set subject_id = 'r2'`],
  [
    'a subject is replaced',
    `insert or replace into custody_subject (subject_kind, subject_id, sequence) values ('recording', 'r1', 1)`,
  ],
  ['a filing is removed', `delete from filing where id = 'f1'`],
  ['a filing is turned to another encounter', `update filing set encounter_id = 'x' where id = 'f1'`],
  ['a filing is dated back', `update filing set filed_at = 0 where id = 'f1'`],
  ['a filing is replaced', `replace into filing select * from filing where id = 'f1'`],
  [
    'a second filing of one recording is put in',
    `insert into filing (id, recording_id, encounter_id, patient_id, "by", filed_at) values ('f2', 'r1', 'e', 'p', 'person', 9)`,
  ],
  [
    'a current filing is put over another',
    `insert or replace into filing (id, recording_id, encounter_id, patient_id, "by", filed_at) values ('f2', 'r1', 'e', 'p', 'person', 9)`,
  ],
  ['a recording is removed', `delete from recording where id = 'r1'`],
  ['the hash of a recording is changed', `update recording set declared_sha256 = 'b' where id = 'r1'`],
  ['a sealed original is pointed elsewhere', `update recording set original_key = 'x' where id = 'r1'`],
  ['a seal is taken off', `update recording set sealed_at = null where id = 'r1'`],
  ['a recording gets the number of another', `update or replace recording set number = 'r2' where id = 'r1'`],
  ['a recording gets the id of another', `update or replace recording set id = 'r2' where id = 'r1'`],
  ['a recording is replaced by its id', `replace into recording select * from recording where id = 'r1'`],
  [
    'a recording is replaced by its number',
    `replace into recording (id, number, device_id, model_id, device_recording_number, stage, declared_sha256, declared_bytes, media_type, recorded_at_device, recorded_at, clock_offset_ms, request_hash, slot_key, slot_expires_at, awaited_at)
     values ('r3', 'r1', 'd', 'm', 'r3', 'awaited', 'b', 1, 'audio/wav', 1, 1, 0, 'h', 'k', 1, 1)`,
  ],
  [
    'a recording is replaced by the device’s number for it',
    `replace into recording (id, number, device_id, model_id, device_recording_number, stage, declared_sha256, declared_bytes, media_type, recorded_at_device, recorded_at, clock_offset_ms, request_hash, slot_key, slot_expires_at, awaited_at)
     values ('r3', 'r3', 'd', 'm', 'r1', 'awaited', 'b', 1, 'audio/wav', 1, 1, 0, 'h', 'k', 1, 1)`,
  ],
  ['a device is removed', `delete from device where id = 'd'`],
  ['a device gets another id', `update device set id = 'x' where id = 'd'`],
  [
    'a device is replaced by its asset tag',
    `replace into device (id, asset_tag, serial_number, model_id, state, created_at) values ('d2', 'HM-1', 's2', 'm', 'in-service', 1)`,
  ],
  ['a person is removed', `delete from user where id = 'u'`],
  ['a person gets another id', `update user set id = 'x' where id = 'u'`],
  [
    'a person is replaced by their address',
    `replace into user (id, name, email, created_at, updated_at) values ('u2', 'Else', 'u@example.org', 1, 1)`,
  ],
];

describe.each(['our own connection', 'a connection without our pragmas'] as const)('on %s', (whose) => {
  test.each(ATTACKS)('it is refused that %s', async (_, statement) => {
    const client = whose === 'our own connection' ? fresh.database.writer : stranger;
    const before = await contents();
    await expect(client.executeMultiple(statement)).rejects.toThrow();
    expect(await contents()).toBe(before);
  });
});

test('a filing can be superseded once, and then stands as it is', async () => {
  const { writer } = fresh.database;
  await writer.execute(`update filing set superseded_at = 10, superseded_by = 'f2' where id = 'f1'`);
  await expect(
    writer.execute(`update filing set superseded_at = null, superseded_by = null where id = 'f1'`),
  ).rejects.toThrow('superseded');
});

test('a recording still moves on along its passage', async () => {
  await fresh.database.writer.execute(`update recording set verdict = 'care', version = 2 where id = 'r1'`);
  const { rows } = await fresh.database.client.execute(`select verdict from recording where id = 'r1'`);
  expect(rows[0]?.verdict).toBe('care');
});

test('an entry that cannot be appended takes its change with it', async () => {
  await expect(
    fresh.database.write(async (tx) => {
      await tx.run(`update device set state = 'retired' where id = 'd'`);
      await appendEntries(tx, 1, [{ kind: 'device-state-changed', actor: SERVICE_ACTOR, subjects: [] }]);
      throw new Error('the process thinks better of it');
    }),
  ).rejects.toThrow();
  const { rows } = await fresh.database.client.execute(`select state from device where id = 'd'`);
  expect(rows[0]?.state).toBe('in-service');
});
