import { eq, inArray } from 'drizzle-orm';
import { decodeJwt, generateKeyPair, SignJWT } from 'jose';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { credential, device, listeningSession, recording, signingKey } from '@/db/schema';
import { ServiceProblem } from '@/devices/agent/answers';
import type { Device } from '@/devices/agent/device';
import { heartbeat } from '@/devices/agent/heartbeat';
import { sendRecording } from '@/devices/agent/upload';
import { openSession } from '@/lib/filing/openSession';
import { reportLost, sentSince } from '@/lib/fleet/reportLost';
import { noticeWork } from '@/lib/http/notices';
import { distrustSigningKey, retireSigningKeys, rotateSigningKey } from '@/lib/keys/changeSigningKey';
import { currentSigningKey, privateKeyOf, publicKeySet } from '@/lib/keys/signingKeys';
import type { Authorized } from '@/lib/platform/authority';
import { runOutboxOnce } from '@/lib/platform/outbox';
import { advanceRuns } from '@/lib/rotation/advanceRuns';
import { readRun } from '@/lib/rotation/readRuns';
import { type NewRun, startRun } from '@/lib/rotation/startRun';
import { steerRun } from '@/lib/rotation/steerRun';
import { entriesOf } from '../support/entries';
import { chestWav, clipOf, openPassageHouse, type PassageHouse } from '../support/passageHouse';

let house: PassageHouse;
let admin: Authorized<'credential.write'> & Authorized<'credential.read'> & Authorized<'device.lost'>;
beforeAll(async () => {
  house = await openPassageHouse();
  admin = (await house.clinician('none')) as never;
});
afterAll(() => house.close());

const HOUR_MS = 3_600_000;
const EVERYBODY = { wardId: null, modelId: null, firmware: null, endingBefore: null };
const runOf = (more: Partial<NewRun> = {}): NewRun => ({
  selection: EVERYBODY,
  waveSize: 1000,
  wavePauseMinutes: 0,
  deadlineHours: 24,
  atDeadline: 'keep',
  reason: 'yearly rotation',
  ...more,
});
const beat = (agent: Device) => heartbeat(agent, { batteryPercent: 80, queued: 0 });
const advance = async () => {
  while (await advanceRuns(house.services));
};
const credentialsOf = (deviceId: string) =>
  house.services.read.select().from(credential).where(eq(credential.deviceId, deviceId));
/** Every credential so far out of the way, so that a run hits only those of its own test. */
async function alone() {
  await house.services.write(async (tx) => {
    await tx
      .update(credential)
      .set({ state: 'revoked', endReason: 'of another test' })
      .where(inArray(credential.state, ['issued', 'in-use', 'superseded']));
  });
  await advance();
}
async function used(count: number) {
  const devices = [];
  for (let i = 0; i < count; i++) {
    const made = await house.enrolled();
    await beat(made.agent);
    devices.push(made);
  }
  return devices;
}
const codeOf = async (work: Promise<unknown>): Promise<string> => {
  const error = await work.then(
    () => null,
    (caught: unknown) => caught,
  );
  return error instanceof ServiceProblem ? error.code : String(error);
};

test('a run over all renews each credential at its device’s next call, ends by itself, and nothing is refused', async () => {
  await alone();
  const devices = await used(3);
  const { id, members } = await startRun(house.services, admin, runOf());
  expect(members).toBe(3);
  await advance();
  for (const { agent } of devices) await beat(agent);
  await advance();
  const half = await readRun(house.services, admin, id, { view: 'stragglers' });
  expect(half.rows.map(({ renewed }) => renewed)).toEqual([true, true, true]);
  for (const { agent } of devices) await beat(agent);
  await advance();
  const { run } = await readRun(house.services, admin, id, { view: 'done' });
  expect(run).toMatchObject({ state: 'ended', counts: { done: 3, waiting: 0, asked: 0 } });
  for (const { id: deviceId } of devices)
    expect((await credentialsOf(deviceId)).map(({ state }) => state).sort()).toEqual(['in-use', 'retired']);
  const kinds = (await entriesOf(house)).map(({ kind }) => kind);
  expect(kinds.filter((kind) => kind === 'rotation-started')).toHaveLength(1);
  expect(kinds.filter((kind) => kind === 'rotation-ended')).toHaveLength(1);
});

test('waves tell so many at a time, a paused run tells nobody, and stragglers are named', async () => {
  await alone();
  const devices = await used(3);
  const { id } = await startRun(house.services, admin, runOf({ waveSize: 1, wavePauseMinutes: 10 }));
  await advance();
  const asked = async () => {
    const { rows } = await readRun(house.services, admin, id, { view: 'stragglers' });
    return rows.filter(({ state }) => state === 'asked').length;
  };
  expect(await asked()).toBe(1);
  await advance();
  expect(await asked()).toBe(1);
  house.clock.advance(10 * 60_000);
  await steerRun(house.services, admin, id, { to: 'pause', version: 1 });
  await advance();
  expect(await asked()).toBe(1);
  await expect(steerRun(house.services, admin, id, { to: 'resume', version: 1 })).rejects.toMatchObject({
    code: 'stale',
  });
  await steerRun(house.services, admin, id, { to: 'resume', version: 2 });
  await advance();
  expect(await asked()).toBe(2);
  const { rows } = await readRun(house.services, admin, id, { view: 'stragglers' });
  expect(rows.map(({ assetTag }) => assetTag)).toEqual(devices.map(({ assetTag }) => assetTag));
  await steerRun(house.services, admin, id, { to: 'cancel', version: 3 });
  await expect(steerRun(house.services, admin, id, { to: 'resume', version: 4 })).rejects.toMatchObject({
    code: 'not-possible',
  });
});

test('who misses the deadline keeps the old credential, or loses it where the run says so', async () => {
  for (const atDeadline of ['keep', 'revoke'] as const) {
    await alone();
    const [late] = await used(1);
    if (!late) throw new Error('no device');
    const { id } = await startRun(house.services, admin, runOf({ atDeadline, deadlineHours: 1 }));
    await advance();
    house.clock.advance(HOUR_MS + 1);
    await advance();
    const { run, rows } = await readRun(house.services, admin, id, { view: 'missed' });
    expect(run).toMatchObject({ state: 'ended', counts: { missed: 1 } });
    expect(rows[0]?.assetTag).toBe(late.assetTag);
    expect(await codeOf(beat(late.agent))).toBe(atDeadline === 'keep' ? 'null' : 'token-invalid');
  }
});

test('a credential is in one run at a time', async () => {
  await alone();
  await used(1);
  const first = await startRun(house.services, admin, runOf());
  await expect(startRun(house.services, admin, runOf())).rejects.toMatchObject({ code: 'not-possible' });
  await steerRun(house.services, admin, first.id, { to: 'cancel', version: 1 });
  expect((await startRun(house.services, admin, runOf())).members).toBe(1);
  await alone();
});

test('a rotated signing key verifies on until the last of its credentials is renewed, then goes', async () => {
  await alone();
  const [one] = await used(1);
  if (!one) throw new Error('no device');
  const before = await currentSigningKey(house.services, 'device-token');
  const { kid } = await rotateSigningKey(house.services, admin, { kid: before.kid, reason: 'by schedule' });
  await expect(
    rotateSigningKey(house.services, admin, { kid: before.kid, reason: 'by schedule' }),
  ).rejects.toMatchObject({ code: 'stale' });
  const published = async () => (await publicKeySet(house.services)).keys.map((key) => key.kid);
  expect(await published()).toEqual(expect.arrayContaining([before.kid, kid]));
  await retireSigningKeys(house.services);
  await beat(one.agent);
  expect(await published()).toContain(before.kid);
  await startRun(house.services, admin, runOf());
  await advance();
  await beat(one.agent);
  await beat(one.agent);
  expect(await retireSigningKeys(house.services)).toBeGreaterThan(0);
  expect(await published()).not.toContain(before.kid);
  await beat(one.agent);
  await advance();
});

test('after a leak devices renew by their own keys and go on; whoever holds the leaked key gets nothing', async () => {
  await alone();
  const victim = await house.enrolled();
  const bearer = await house.enrolled({ signsRequests: false });
  await beat(victim.agent);
  await beat(bearer.agent);
  const leaked = await currentSigningKey(house.services, 'device-token');
  const stolen = await privateKeyOf(house.services, leaked);
  const stolenToken = victim.agent.credential?.token ?? '';
  const answer = await distrustSigningKey(house.services, admin, {
    kid: leaked.kid,
    reason: 'found in a dump',
  });
  expect(answer).toMatchObject({ renewing: 1, enrolling: 1 });
  const [row] = await house.services.read.select().from(signingKey).where(eq(signingKey.kid, leaked.kid));
  expect(row?.compromisedAt).not.toBeNull();
  expect((await publicKeySet(house.services)).keys.map((key) => key.kid)).not.toContain(leaked.kid);

  // A token made with the leaked key, for the victim's credential but for a key of the thief's.
  const thief = await generateKeyPair('EdDSA', { crv: 'Ed25519', extractable: true });
  const forged = await new SignJWT({ ...decodeJwt(stolenToken) })
    .setProtectedHeader({ alg: 'EdDSA', kid: leaked.kid, typ: 'at+jwt' })
    .sign(stolen);
  for (const token of [forged, stolenToken]) {
    const proof = await new SignJWT({
      htm: 'POST',
      htu: `${house.origin}/api/device/v1/token`,
      jti: crypto.randomUUID(),
      iat: Math.floor(Date.now() / 1000),
      ath: Buffer.from(await crypto.subtle.digest('SHA-256', new TextEncoder().encode(token))).toString(
        'base64url',
      ),
    })
      .setProtectedHeader({
        alg: 'EdDSA',
        typ: 'dpop+jwt',
        jwk: (await crypto.subtle.exportKey('jwk', thief.publicKey as CryptoKey)) as never,
      })
      .sign(thief.privateKey);
    const response = await fetch(`${house.origin}/api/device/v1/token`, {
      method: 'POST',
      headers: { authorization: `DPoP ${token}`, dpop: proof, 'content-type': 'application/json' },
      body: '{}',
    });
    expect(response.status).toBe(401);
  }
  expect(await codeOf(beat(bearer.agent))).toBe('token-invalid');

  const sent = await sendRecording(victim.agent, clipOf(chestWav()));
  expect(sent.answer.verdict).toBe('usable');
  expect(victim.agent.credential?.token).not.toBe(stolenToken);
});

test('an ended credential that is used again quarantines its family and is told by mail; a late call is not', async () => {
  await alone();
  const { agent, id } = await house.enrolled();
  await beat(agent);
  const old = agent.credential;
  if (!old) throw new Error('not enrolled');
  await startRun(house.services, admin, runOf());
  await advance();
  await beat(agent);
  await beat(agent);
  const call = () =>
    agent.api.call(
      '/api/device/v1/heartbeat',
      { deviceTime: Date.now(), batteryPercent: 1, queued: 0 },
      {
        keys: agent.keys,
        credential: old,
      },
    );
  // Under way when the successor was first used: refused, and no alarm.
  expect(await codeOf(call())).toBe('token-invalid');
  await beat(agent);
  house.clock.advance(5 * 60_000);
  expect(await codeOf(call())).toBe('token-invalid');
  expect(await codeOf(beat(agent))).toBe('token-invalid');
  expect((await credentialsOf(id)).map(({ state }) => state).sort()).toEqual(['retired', 'revoked']);
  const entries = (await entriesOf(house)).filter((entry) =>
    entry.subjects.some((subject) => subject.id === id),
  );
  const misused = entries.filter(({ kind }) => kind === 'credential-misused');
  expect(misused.filter(({ detail }) => detail?.label === old.credentialId)).toHaveLength(1);
  expect(entries.map(({ kind }) => kind)).toContain('credential-quarantined');
  expect(await runOutboxOnce(house.services, noticeWork(house.services), { only: 'credential-alarm' })).toBe(
    1,
  );
});

test('a lost device ends in one act: credentials, slots, session; what it sent since is listed', async () => {
  const { agent, id } = await house.enrolled();
  const ill = await house.encounter();
  const clinician = await house.clinician(ill.wardId);
  await openSession(house.services, clinician, { encounterId: ill.id, deviceId: id } as never).catch(
    () => undefined,
  );
  const sent = await sendRecording(agent, clipOf(chestWav()));
  const now = house.clock.now();
  const [row] = await house.services.read.select().from(device).where(eq(device.id, id));
  const report = { lastInHandAt: now - HOUR_MS, reason: 'left in a taxi', version: row?.version ?? 0 };
  await expect(
    reportLost(house.services, admin, id, { ...report, lastInHandAt: now + HOUR_MS }),
  ).rejects.toMatchObject({ code: 'not-possible' });
  expect(await reportLost(house.services, admin, id, report)).toMatchObject({ state: 'lost', sentSince: 1 });
  await expect(reportLost(house.services, admin, id, report)).rejects.toMatchObject({ code: 'stale' });
  expect(await codeOf(beat(agent))).toBe('token-invalid');
  expect((await credentialsOf(id)).every(({ state }) => state === 'revoked')).toBe(true);
  const open = await house.services.read
    .select()
    .from(listeningSession)
    .where(eq(listeningSession.deviceId, id));
  expect(open.every(({ closedAt }) => closedAt !== null)).toBe(true);
  const listed = await sentSince(house.services, admin, id, now - HOUR_MS);
  expect(listed.map(({ number }) => number)).toEqual([sent.answer.recording]);
  const [kept] = await house.services.read
    .select()
    .from(recording)
    .where(eq(recording.number, sent.answer.recording));
  expect(kept?.sealedAt).not.toBeNull();
});
