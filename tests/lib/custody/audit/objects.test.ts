import { execFile } from 'node:child_process';
import { eq } from 'drizzle-orm';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { derivedObject, recording } from '@/db/schema';
import { AUDIT_CODES } from '@/lib/custody/audit/findings';
import { type AuditedHouse, audit, type Copy, copyOf, openAuditedHouse } from '@/tests/support/auditedHouse';

let audited: AuditedHouse;
beforeAll(async () => {
  audited = await openAuditedHouse(5);
});
afterAll(() => audited.close());

const rowOf = async (number: string | undefined) => {
  const [row] = await audited.house.services.read
    .select()
    .from(recording)
    .where(eq(recording.number, number ?? ''));
  if (!row?.originalKey) throw new Error('no such recording');
  return { ...row, originalKey: row.originalKey };
};
const pictureOf = async (recordingId: string) => {
  const [row] = await audited.house.services.read
    .select()
    .from(derivedObject)
    .where(eq(derivedObject.recordingId, recordingId));
  if (!row) throw new Error('no picture');
  return row;
};

describe('rows that pages are drawn from', () => {
  let copy: Copy;
  beforeEach(async () => {
    copy = await copyOf(audited);
  });
  afterEach(() => copy.close());
  const first = () => audited.numbers[0] ?? '';

  test.each([
    ['recording-changed', `update recording set declared_sha256 = 'ff' where number = ?`],
    ['recording-changed', `update recording set lock_kind = 'none' where number = ?`],
    ['verdict-changed', `update recording set verdict = 'care' where number = ?`],
    [
      'derived-changed',
      `update derived_object set sha256 = 'ff' where kind = 'peaks' and recording_id = (select id from recording where number = ?)`,
    ],
    [
      'derived-changed',
      `update derived_object set input_sha256 = 'ff' where kind = 'peaks' and recording_id = (select id from recording where number = ?)`,
    ],
    [
      'derived-missing',
      `delete from derived_object where kind = 'peaks' and recording_id = (select id from recording where number = ?)`,
    ],
  ])('%s: %s', async (code, statement) => {
    await copy.sql(statement, [first()]);
    const { findings } = await copy.audit();
    expect(findings).toContainEqual(expect.objectContaining({ code, recording: first() }));
  });

  test('a recording that no entry speaks of is named', async () => {
    await copy.sql(
      `insert into recording select 'forged', 'FORG-ED22', device_id, model_id, credential_id, 'forged', ${'stage, stopped, declared_sha256, declared_bytes, media_type, recorded_at_device, recorded_at, clock_offset_ms, site, chestpiece_side, gain_step, filter, firmware, scanned_identifier, request_hash, slot_key, slot_expires_at, awaited_at, received_at, sealed_at, measured_at, filed_at, original_key, locked_until, lock_kind, verdict, policy_version, findings, measures, facts, metadata, duration_seconds, sample_rate_hz, noise_floor_dbfs, active_level_dbfs, dc_fraction, kept_reason, kept_by, kept_at, version'} from recording where number = ?`,
      [first()],
    );
    expect((await copy.audit({ withBytes: false })).findings).toContainEqual(
      expect.objectContaining({ code: 'recording-without-entry', recording: 'FORG-ED22' }),
    );
  });
});

describe('objects in storage', () => {
  const named = async (code: string, number: string | undefined) => {
    const { findings } = await audit(audited.house.services);
    expect(findings).toContainEqual(expect.objectContaining({ code, recording: number }));
  };
  const { numbers } = { numbers: () => audited.numbers };

  test('an original with one byte turned is named', async () => {
    const { services, fake } = audited.house;
    const row = await rowOf(numbers()[1]);
    const bytes = Buffer.from(await services.storage.getBytes(row.originalKey, 1e7));
    bytes[bytes.length - 1] = (bytes.at(-1) ?? 0) ^ 1;
    await fake.backdoor.replaceBytes('bellkeep', row.originalKey, bytes);
    await named('original-altered', row.number);
  });

  test('an original that was cut short is named', async () => {
    const row = await rowOf(numbers()[4]);
    await audited.house.fake.backdoor.replaceBytes('bellkeep', row.originalKey, Buffer.from('RIFF'));
    await named('original-altered', row.number);
  });

  test('an original that is gone is named', async () => {
    const row = await rowOf(numbers()[2]);
    await audited.house.fake.backdoor.remove('bellkeep', row.originalKey);
    await named('original-missing', row.number);
  });

  test('an original that was unlocked is named', async () => {
    const row = await rowOf(numbers()[3]);
    await audited.house.fake.backdoor.unlock('bellkeep', row.originalKey);
    await named('original-unlocked', row.number);
  });

  test('a picture that was altered and one that is gone are named', async () => {
    const row = await rowOf(numbers()[0]);
    const picture = await pictureOf(row.id);
    await audited.house.fake.backdoor.replaceBytes('bellkeep', picture.key, Buffer.alloc(picture.bytes));
    await named('derived-altered', row.number);
    await audited.house.services.storage.remove(picture.key);
    await named('derived-missing', row.number);
  });
});

test('the command says what is wrong, one finding a line, and ends with 1', async () => {
  const { env } = audited.house.services;
  const settings = Object.fromEntries(
    Object.entries(env).flatMap(([name, value]) => (value === undefined ? [] : [[name, String(value)]])),
  );
  const run = (...args: string[]) =>
    new Promise<{ status: number; stdout: string }>((resolve) => {
      const child = execFile(
        process.execPath,
        ['--import', 'tsx', 'lib/launch/auditRun.ts', ...args],
        { env: { ...process.env, ...settings } },
        (_, stdout) => resolve({ status: child.exitCode ?? -1, stdout }),
      );
    });
  const json = await run('--json');
  const lines = json.stdout
    .trim()
    .split('\n')
    .map((line) => JSON.parse(line) as { code?: string; ok?: boolean });
  expect(json.status).toBe(1);
  expect(lines.at(-1)).toMatchObject({ ok: false, entries: expect.any(Number) });
  for (const { code } of lines.slice(0, -1)) expect(Object.keys(AUDIT_CODES)).toContain(code);
  const plain = await run('--no-bytes');
  expect(plain.status).toBe(1);
  expect(plain.stdout).toContain('original-missing');
  expect(plain.stdout).toContain(audited.numbers[2]);
  expect((await run('--unknown')).status).toBe(2);
});
