import { createHash, generateKeyPairSync } from 'node:crypto';
import { eq } from 'drizzle-orm';
import {
  createLocalJWKSet,
  decodeJwt,
  decodeProtectedHeader,
  importJWK,
  jwtVerify,
  SignJWT,
  UnsecuredJWT,
} from 'jose';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { credential, device } from '@/db/schema';
import { createApi } from '@/devices/agent/api';
import { createDevice, type Device } from '@/devices/agent/device';
import { makeKeys } from '@/devices/agent/keys';
import { dpopProof } from '@/devices/agent/proofs';
import { renew } from '@/devices/agent/renew';
import { askRenewal } from '@/lib/credentials/askRenewal';
import { revokeCredential } from '@/lib/credentials/revokeCredential';
import { openPassageHouse, type PassageHouse } from '../support/passageHouse';

let house: PassageHouse;
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(() => house.close());

const admin = {
  id: 'it',
  name: 'IT',
  email: '',
  jobTitle: null,
  roles: ['itadmin'],
  wardIds: [],
  sessionId: '',
} as never;
const PATH = '/api/device/v1/heartbeat';
const beat = (agent: Device) => agent.call<{ renew: boolean }>(PATH, { deviceTime: Date.now() });
const tokenOf = (agent: Device) => agent.credential?.token ?? '';
const rowsOf = (id: string) =>
  house.services.read
    .select()
    .from(credential)
    .where(eq(credential.deviceId, id))
    .orderBy(credential.issuedAt);

/** One request with whatever token and proof a thief may have. */
async function call(token: string, proof: string | null, scheme = 'DPoP') {
  const response = await fetch(house.origin + PATH, {
    method: 'POST',
    headers: {
      'content-type': 'application/json',
      authorization: `${scheme} ${token}`,
      ...(proof === null ? {} : { dpop: proof }),
    },
    body: JSON.stringify({ deviceTime: Date.now() }),
  });
  const problem = (await response.json()) as { type?: string };
  return {
    status: response.status,
    code: problem.type?.split('/').at(-1),
    nonce: response.headers.get('dpop-nonce'),
  };
}
const nonce = async () => (await call('x', null)).nonce ?? '';
const proofFor = async (agent: Device, more: Partial<Parameters<typeof dpopProof>[1]> = {}) =>
  dpopProof(agent.keys, {
    method: 'POST',
    url: house.origin + PATH,
    token: tokenOf(agent),
    nonce: await nonce(),
    nowMs: Date.now(),
    ...more,
  });

test('the published keys verify a token, whose claims name issuer, audience, device, key and life', async () => {
  const { agent, id } = await house.enrolled();
  const keys = createLocalJWKSet(
    (await (await fetch(`${house.origin}/.well-known/jwks.json`)).json()) as never,
  );
  const { payload, protectedHeader } = await jwtVerify(tokenOf(agent), keys, {
    issuer: house.origin,
    audience: `${house.origin}/api/device/v1`,
    typ: 'at+jwt',
  });
  expect(protectedHeader).toMatchObject({ alg: 'EdDSA', kid: expect.any(String) });
  expect(payload).toMatchObject({
    sub: id,
    jti: expect.any(String),
    iat: expect.any(Number),
    exp: expect.any(Number),
    cnf: { jkt: expect.any(String) },
  });
});

test('a stolen token is worthless from another key, without a proof, and as plain bearer', async () => {
  const { agent } = await house.enrolled();
  const thief = await makeKeys();
  const forged = await dpopProof(thief, {
    method: 'POST',
    url: house.origin + PATH,
    token: tokenOf(agent),
    nonce: await nonce(),
    nowMs: Date.now(),
  });
  expect(await call(tokenOf(agent), forged)).toMatchObject({ status: 401, code: 'proof-invalid' });
  expect(await call(tokenOf(agent), null)).toMatchObject({ status: 401, code: 'proof-invalid' });
  expect(await call(tokenOf(agent), null, 'Bearer')).toMatchObject({ status: 401, code: 'token-invalid' });
});

test('a proof is good once, for its own method, address, token and nonce', async () => {
  const { agent } = await house.enrolled();
  const good = await proofFor(agent);
  expect(await call(tokenOf(agent), good)).toMatchObject({ status: 200 });
  expect(await call(tokenOf(agent), good)).toMatchObject({ status: 401, code: 'proof-invalid' });
  expect(await call(tokenOf(agent), await proofFor(agent, { method: 'GET' }))).toMatchObject({
    code: 'proof-invalid',
  });
  expect(
    await call(tokenOf(agent), await proofFor(agent, { url: `${house.origin}/api/device/v1/token` })),
  ).toMatchObject({ code: 'proof-invalid' });
  expect(await call(tokenOf(agent), await proofFor(agent, { token: 'another' }))).toMatchObject({
    code: 'proof-invalid',
  });
  expect(await call(tokenOf(agent), await proofFor(agent, { nonce: null }))).toMatchObject({
    status: 401,
    code: 'use-dpop-nonce',
  });
  expect(await call(tokenOf(agent), await proofFor(agent, { nonce: 'made-up' }))).toMatchObject({
    code: 'use-dpop-nonce',
  });
});

test('a device whose clock is decades off proves itself all the same', async () => {
  const { agent } = await house.enrolled();
  expect(await call(tokenOf(agent), await proofFor(agent, { nowMs: 0 }))).toMatchObject({ status: 200 });
});

// The list of RFC 8725 (JSON Web Token Best Current Practices), sections 3.1 to 3.12, and RFC 9068, 4.
test('hostile tokens are refused alike', async () => {
  const { agent, id } = await house.enrolled();
  const token = tokenOf(agent);
  const claims = decodeJwt(token);
  const { kid } = decodeProtectedHeader(token);
  const jwks = (await (await fetch(`${house.origin}/.well-known/jwks.json`)).json()) as {
    keys: Record<string, string>[];
  };
  const own = await makeKeys();
  const sign = (header: Record<string, unknown>, payload = claims) =>
    new SignJWT(payload)
      .setProtectedHeader({ alg: 'EdDSA', typ: 'at+jwt', kid, ...header } as never)
      .sign(own.privateKey);
  const hmacKey = new TextEncoder().encode(JSON.stringify(jwks.keys[0]));
  const hostile: Record<string, string> = {
    'alg none': new UnsecuredJWT(claims).encode(),
    'HS256 over the public key': await new SignJWT(claims)
      .setProtectedHeader({ alg: 'HS256', typ: 'at+jwt', ...(kid ? { kid } : {}) })
      .sign(hmacKey),
    'another key under our kid': await sign({}),
    'a key of its own in the header': await sign({ jwk: own.publicJwk, kid: undefined }),
    'an address of keys in the header': await sign({ jku: 'http://127.0.0.1:1/keys', kid: 'unknown' }),
    'unknown kid': await sign({ kid: 'nobody' }),
    'wrong type': await sign({ typ: 'JWT' }),
    'a changed claim': `${token.split('.')[0]}.${Buffer.from(JSON.stringify({ ...claims, sub: 'other' })).toString('base64url')}.${token.split('.')[2]}`,
    'a cut signature': token.slice(0, -4),
    'no dots': 'abc',
    'very long': 'a'.repeat(5000),
  };
  for (const [name, forged] of Object.entries(hostile)) {
    const proof = await dpopProof(agent.keys, {
      method: 'POST',
      url: house.origin + PATH,
      token: forged,
      nonce: await nonce(),
      nowMs: Date.now(),
    });
    expect(await call(forged, proof), name).toMatchObject({ status: 401, code: 'token-invalid' });
  }
  expect((await house.services.read.select().from(device).where(eq(device.id, id)))[0]?.state).toBe(
    'in-service',
  );
});

test('rotating one: the device is told, renews, and the old credential lives until the new one is used', async () => {
  const { agent, id } = await house.enrolled();
  await beat(agent);
  const [before] = await rowsOf(id);
  await askRenewal(house.services, admin, { id: before?.id ?? '', version: before?.version ?? 0 });
  expect((await beat(agent)).renew).toBe(true);
  const old = tokenOf(agent);
  const lost = await agent.call<{ token: string }>('/api/device/v1/token', {});
  const again = await agent.call<{ token: string }>('/api/device/v1/token', {});
  expect(again.token).toBe(lost.token);
  expect(await call(old, await proofFor(agent))).toMatchObject({ status: 200 });
  await renew(agent);
  expect((await beat(agent)).renew).toBe(false);
  expect(await call(old, await proofFor(agent, { token: old }))).toMatchObject({
    status: 401,
    code: 'token-invalid',
  });
  expect((await rowsOf(id)).map((row) => row.state)).toEqual(['retired', 'in-use']);
});

test('the overlap ends after 24 hours even when the new credential was never used', async () => {
  const { agent } = await house.enrolled();
  const old = tokenOf(agent);
  await agent.call('/api/device/v1/token', {});
  // 24 hours, unless policy says otherwise.
  house.clock.advance(24 * 3_600_000 + 1000);
  expect(await call(old, await proofFor(agent))).toMatchObject({ status: 401, code: 'token-invalid' });
});

test('revoking one ends its whole family at once', async () => {
  const { agent, id } = await house.enrolled();
  await renew(agent);
  await beat(agent);
  const living = (await rowsOf(id)).find((row) => row.state === 'in-use');
  await revokeCredential(house.services, admin, {
    id: living?.id ?? '',
    version: living?.version ?? 0,
    reason: 'left in a taxi',
  });
  await expect(beat(agent)).rejects.toMatchObject({ status: 401 });
  expect((await rowsOf(id)).map((row) => row.state)).toEqual(['retired', 'revoked']);
});

test('a stale page cannot revoke what was changed in the meantime', async () => {
  const { agent, id } = await house.enrolled();
  await beat(agent);
  const [row] = await rowsOf(id);
  await askRenewal(house.services, admin, { id: row?.id ?? '', version: row?.version ?? 0 });
  await expect(
    revokeCredential(house.services, admin, {
      id: row?.id ?? '',
      version: row?.version ?? 0,
      reason: 'too late',
    }),
  ).rejects.toMatchObject({ code: 'stale' });
});

test('a model that cannot sign gets a plain bearer credential that lives shorter', async () => {
  const { agent, id } = await house.enrolled({ signsRequests: false });
  expect(agent.credential?.tokenType).toBe('Bearer');
  await expect(beat(agent)).resolves.toMatchObject({ renew: false });
  const [row] = await rowsOf(id);
  expect(row?.boundThumbprint).toBeNull();
  expect((row?.expiresAt ?? 0) - (row?.issuedAt ?? 0)).toBeLessThan(15 * 86_400_000);
});

test('a device taken out of service keeps its clips: slots are refused, the heartbeat is not', async () => {
  const { agent, id } = await house.enrolled();
  await house.services.write(async (tx) => {
    await tx.update(device).set({ state: 'quarantined' }).where(eq(device.id, id));
  });
  await expect(beat(agent)).resolves.toMatchObject({ state: 'quarantined' });
  const sha256 = createHash('sha256').update('x').digest('hex');
  await expect(
    agent.call('/api/device/v1/recordings', {
      recordingNumber: '1',
      sha256,
      bytes: 1,
      mediaType: 'audio/wav',
      recordedAt: 1,
      deviceTime: 1,
    }),
  ).rejects.toMatchObject({ status: 403, code: 'device-not-in-service' });
});

test('private halves of signing keys are sealed at rest', async () => {
  const rows = await house.services.read.query.signingKey.findMany();
  expect(rows.length).toBeGreaterThan(0);
  for (const row of rows) {
    expect(row.sealedPrivateJwk).toMatch(/^v1\./);
    expect(JSON.stringify(JSON.parse(row.publicJwk))).not.toContain('"d"');
  }
});

test('a token signed elsewhere with RSA is refused', async () => {
  const { agent } = await house.enrolled();
  const { privateKey } = generateKeyPairSync('rsa', { modulusLength: 2048 });
  const forged = await new SignJWT(decodeJwt(tokenOf(agent)))
    .setProtectedHeader({ alg: 'RS256', typ: 'at+jwt', kid: decodeProtectedHeader(tokenOf(agent)).kid ?? '' })
    .sign(await importJWK(privateKey.export({ format: 'jwk' }), 'RS256'));
  expect(await call(forged, await proofFor(agent, { token: forged }))).toMatchObject({
    status: 401,
    code: 'token-invalid',
  });
});

test('bodies are strict, small and JSON', async () => {
  const { agent } = await house.enrolled();
  await expect(agent.call(PATH, { deviceTime: Date.now(), more: 1 })).rejects.toMatchObject({
    status: 400,
    code: 'body-invalid',
  });
  await expect(agent.call(PATH, { deviceTime: 'now' })).rejects.toMatchObject({ status: 400 });
  await expect(agent.call(PATH, { deviceTime: 1, firmware: 'x'.repeat(20_000) })).rejects.toMatchObject({
    status: 413,
    code: 'body-too-large',
  });
  const unknown = await createDevice({ origin: house.origin, serialNumber: 'x', stateFolder: null });
  await expect(unknown.call(PATH, {})).rejects.toThrow('not enrolled');
});

test('a device that wakes without a nonce is given one, and its second try goes well', async () => {
  const { agent } = await house.enrolled();
  const asked: (string | null)[] = [];
  const awake = createApi({
    origin: house.origin,
    clock: { now: () => Date.now() },
    fetch: async (...args) => {
      const response = await fetch(...args);
      asked.push(response.headers.get('dpop-nonce'));
      return response;
    },
  });
  if (!agent.credential) throw new Error('not enrolled');
  await expect(
    awake.call(PATH, { deviceTime: Date.now() }, { keys: agent.keys, credential: agent.credential }),
  ).resolves.toMatchObject({ state: 'in-service' });
  expect(asked).toHaveLength(2);
  // RFC 9449, 8.1: one nonce, not a list of them.
  expect(asked[0]).toMatch(/^[\w-]+$/);
});
