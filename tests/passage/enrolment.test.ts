import { eq } from 'drizzle-orm';
import { calculateJwkThumbprint } from 'jose';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { credential, device, enrolmentCode } from '@/db/schema';
import { createDevice } from '@/devices/agent/device';
import { enrol } from '@/devices/agent/enrol';
import { enrolmentProof } from '@/devices/agent/proofs';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { CODE_LIFETIME_MS, issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { openPassageHouse, type PassageHouse } from '../support/passageHouse';

let house: PassageHouse;
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(() => house.close());

const deviceOf = (serialNumber: string, keyType: 'Ed25519' | 'P-256' = 'Ed25519') =>
  createDevice({
    origin: house.origin,
    serialNumber,
    stateFolder: null,
    keyType,
    sleep: async () => undefined,
  });
const rowOf = async (id: string) =>
  (await house.services.read.select().from(device).where(eq(device.id, id)))[0];

test.each(['Ed25519', 'P-256'] as const)(
  'a device with an %s key gets a credential bound to it, and comes into service',
  async (keyType) => {
    const listed = await house.listDevice();
    const agent = await deviceOf(listed.serialNumber, keyType);
    const answer = await enrol(agent, listed.code);
    expect(answer).toMatchObject({ assetTag: listed.assetTag, tokenType: 'DPoP' });
    expect(await rowOf(listed.id)).toMatchObject({
      state: 'in-service',
      keyThumbprint: await calculateJwkThumbprint(agent.keys.publicJwk),
    });
  },
);

test('the code is taken however it is spaced and cased', async () => {
  const listed = await house.listDevice();
  const code = `${listed.code.slice(0, 5)}-${listed.code.slice(5)}`.toLowerCase();
  await expect(enrol(await deviceOf(listed.serialNumber), code)).resolves.toMatchObject({
    assetTag: listed.assetTag,
  });
});

test('the same code by the same key gives the same credential, byte for byte', async () => {
  const listed = await house.listDevice();
  const agent = await deviceOf(listed.serialNumber);
  const first = await enrol(agent, listed.code);
  const again = await enrol(agent, listed.code);
  expect(again.token).toBe(first.token);
  expect(
    await house.services.read.select().from(credential).where(eq(credential.deviceId, listed.id)),
  ).toHaveLength(1);
});

test('a used code by another key is refused', async () => {
  const listed = await house.listDevice();
  await enrol(await deviceOf(listed.serialNumber), listed.code);
  await expect(enrol(await deviceOf(listed.serialNumber), listed.code)).rejects.toMatchObject({
    status: 403,
    code: 'enrolment-refused',
  });
});

test('after five wrong codes the right one is dead', async () => {
  const listed = await house.listDevice();
  const agent = await deviceOf(listed.serialNumber);
  for (let i = 0; i < 5; i++)
    await expect(enrol(agent, '2222222222')).rejects.toMatchObject({ code: 'enrolment-refused' });
  await expect(enrol(agent, listed.code)).rejects.toMatchObject({ code: 'enrolment-refused' });
  expect((await rowOf(listed.id))?.state).toBe('waiting');
});

test('a code ends after 24 hours, and a new one ends the one before', async () => {
  const listed = await house.listDevice();
  const { code: newer } = await issueEnrolmentCode(house.services, SERVICE_ACTOR, listed.id);
  const agent = await deviceOf(listed.serialNumber);
  await expect(enrol(agent, listed.code)).rejects.toMatchObject({ code: 'enrolment-refused' });
  house.clock.advance(CODE_LIFETIME_MS);
  await expect(enrol(agent, newer)).rejects.toMatchObject({ code: 'enrolment-refused' });
});

test('a code of another device, an unknown serial number and a bad proof are answered alike', async () => {
  const [one, other] = [await house.listDevice(), await house.listDevice()];
  const agent = await deviceOf(one.serialNumber);
  const answers: string[] = [];
  const post = async (body: unknown) => {
    const response = await fetch(`${house.origin}/api/device/v1/enrol`, {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify(body),
    });
    const { requestId: _id, ...problem } = (await response.json()) as Record<string, unknown>;
    answers.push(JSON.stringify([response.status, problem]));
  };
  const body = async (serialNumber: string, code: string, signed = code) => ({
    serialNumber,
    code,
    publicKey: agent.keys.publicJwk,
    proof: await enrolmentProof(agent.keys, { origin: house.origin, serialNumber, code: signed }),
  });
  await post(await body(one.serialNumber, other.code));
  await post(await body('NOBODY', one.code));
  await post(await body(one.serialNumber, one.code, '3333333333'));
  await post({ ...(await body(one.serialNumber, one.code)), proof: 'eyJhbGciOiJub25lIn0.e30.' });
  expect(new Set(answers).size).toBe(1);
});

test('a proof made for another service does not enrol', async () => {
  const listed = await house.listDevice();
  const agent = await deviceOf(listed.serialNumber);
  const proof = await enrolmentProof(agent.keys, {
    origin: 'https://elsewhere.example',
    serialNumber: listed.serialNumber,
    code: listed.code,
  });
  await expect(
    agent.api.call('/api/device/v1/enrol', {
      serialNumber: listed.serialNumber,
      code: listed.code,
      publicKey: agent.keys.publicJwk,
      proof,
    }),
  ).rejects.toMatchObject({ code: 'enrolment-refused' });
});

test('a private key in the request is refused by the schema', async () => {
  const listed = await house.listDevice();
  const agent = await deviceOf(listed.serialNumber);
  const proof = await enrolmentProof(agent.keys, {
    origin: house.origin,
    serialNumber: listed.serialNumber,
    code: listed.code,
  });
  await expect(
    agent.api.call('/api/device/v1/enrol', {
      serialNumber: listed.serialNumber,
      code: listed.code,
      publicKey: agent.keys.privateJwk,
      proof,
    }),
  ).rejects.toMatchObject({ status: 400, code: 'body-invalid' });
});

test('the code itself stands nowhere in the database', async () => {
  const listed = await house.listDevice();
  const rows = await house.services.read
    .select()
    .from(enrolmentCode)
    .where(eq(enrolmentCode.deviceId, listed.id));
  expect(JSON.stringify(rows)).not.toContain(listed.code);
  expect(listed.code).toMatch(/^[2-9A-HJKMNP-TV-Z]{10}$/);
});

test('enrolling again ends what the device had', async () => {
  const { agent, id } = await house.enrolled();
  const { code } = await issueEnrolmentCode(house.services, SERVICE_ACTOR, id);
  const row = await rowOf(id);
  const fresh = await deviceOf(row?.serialNumber ?? '');
  await enrol(fresh, code);
  await expect(agent.call('/api/device/v1/heartbeat', { deviceTime: Date.now() })).rejects.toMatchObject({
    status: 401,
    code: 'token-invalid',
  });
  await expect(fresh.call('/api/device/v1/heartbeat', { deviceTime: Date.now() })).resolves.toMatchObject({
    state: 'in-service',
  });
});
