import { eq } from 'drizzle-orm';
import { exportJWK, generateKeyPair, type JWK, SignJWT } from 'jose';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { POST as revokeRoute } from '@/app/api/clients/[id]/revoke/route';
import { POST as rotateRoute } from '@/app/api/clients/[id]/rotate/route';
import { POST as createRoute, GET as listRoute } from '@/app/api/clients/route';
import { GET as devicesRoute } from '@/app/api/v1/devices/route';
import { GET as ledgerRoute } from '@/app/api/v1/ledger/route';
import { GET as recordingsRoute } from '@/app/api/v1/recordings/route';
import { POST as tokenRoute } from '@/app/api/v1/token/route';
import { apiClient, idempotencyKey } from '@/db/schema';
import { authenticateDevice } from '@/lib/credentials/authenticateDevice';
import { currentSigningKey, privateKeyOf } from '@/lib/keys/signingKeys';
import { type Bedside, openBedside } from '../../support/bedside';
import { call, problemOf } from '../../support/call';
import { entriesOf } from '../../support/entries';
import { signedIn } from '../../support/people';
import { ORIGIN } from '../../support/services';

let house: Bedside;
let admin: Awaited<ReturnType<typeof signedIn>>;
beforeAll(async () => {
  house = await openBedside();
  admin = await signedIn(house, { roles: ['itadmin'] });
});
afterAll(() => house.close());

interface Made {
  clientId: string;
  secret: string;
}
const create = async (body: Record<string, unknown> = {}, headers = {}) =>
  call(createRoute, {
    body: { name: 'Dashboard', scopes: ['recordings.read', 'devices.read'], publicKeys: null, ...body },
    cookie: admin.cookie,
    headers,
  });
const made = async (body: Record<string, unknown> = {}) => (await (await create(body)).json()) as Made;
const basic = ({ clientId, secret }: Made) =>
  `Basic ${Buffer.from(`${clientId}:${secret}`).toString('base64')}`;
const ask = (form: Record<string, string>, authorization = '') =>
  call(tokenRoute, {
    path: '/api/v1/token',
    body: new URLSearchParams({ grant_type: 'client_credentials', ...form }).toString(),
    headers: { 'content-type': 'application/x-www-form-urlencoded', origin: '', authorization },
  });
const tokenFor = async (client: Made, form: Record<string, string> = {}) =>
  ((await (await ask(form, basic(client))).json()) as { access_token: string }).access_token;
const read = (route: Parameters<typeof call>[0], token: string, path = '/api/v1/x') =>
  call(route, { path, headers: { authorization: `Bearer ${token}` } });
const versionOf = async (id: string) => {
  const [row] = await house.services.read.select().from(apiClient).where(eq(apiClient.id, id));
  return row?.version ?? 0;
};

describe('a client with a secret', () => {
  test('gets a token of ten minutes by the form of the standard, and reads what its scopes allow', async () => {
    const client = await made();
    const answer = await ask({}, basic(client));
    expect(answer.headers.get('cache-control')).toBe('no-store');
    const token = (await answer.json()) as Record<string, unknown>;
    expect(token).toMatchObject({
      token_type: 'Bearer',
      expires_in: 600,
      scope: 'recordings.read devices.read',
    });
    const bearer = String(token.access_token);
    const [head, payload] = bearer
      .split('.')
      .slice(0, 2)
      .map((part) => JSON.parse(Buffer.from(part, 'base64url').toString()));
    // RFC 9068, 2: typ and the claims that it asks for.
    expect(head).toMatchObject({ typ: 'at+jwt', alg: 'EdDSA' });
    expect(payload).toMatchObject({
      iss: ORIGIN,
      aud: `${ORIGIN}/api/v1`,
      sub: client.clientId,
      client_id: client.clientId,
      scope: 'recordings.read devices.read',
    });
    expect((await read(devicesRoute, bearer)).status).toBe(200);
    const refused = await read(ledgerRoute, bearer);
    expect(refused.headers.get('www-authenticate')).toContain('insufficient_scope');
    expect((await problemOf(refused)).code).toBe('scope-missing');
  });

  test('may ask for less, and not for more', async () => {
    const client = await made();
    const less = await tokenFor(client, { scope: 'devices.read' });
    expect((await read(devicesRoute, less)).status).toBe(200);
    expect((await read(recordingsRoute, less)).status).toBe(403);
    expect(await (await ask({ scope: 'ledger.read' }, basic(client))).json()).toMatchObject({
      error: 'invalid_scope',
    });
  });

  test('is shown its secret once: a repeat and the list do not have it, and the database has its hash', async () => {
    const headers = { 'idempotency-key': 'create-client-once' };
    const first = (await (await create({ name: 'Once' }, headers)).json()) as Made;
    const again = (await (await create({ name: 'Once' }, headers)).json()) as Made;
    expect(again).toEqual({ clientId: first.clientId, secret: null });
    expect(first.secret).toMatch(/^[\w-]{43}$/);
    const everything = JSON.stringify([
      await house.services.read.select().from(apiClient),
      await house.services.read.select().from(idempotencyKey),
      await entriesOf(house),
      house.log,
      await (await call(listRoute, { cookie: admin.cookie })).json(),
    ]);
    expect(everything).not.toContain(first.secret);
  });

  test('keeps working while its secret is rotated, and the old one ends after a day', async () => {
    const client = await made();
    const rotated = (await (
      await call(rotateRoute, {
        params: { id: client.clientId },
        body: { version: await versionOf(client.clientId), atOnce: false },
        cookie: admin.cookie,
      })
    ).json()) as Made;
    expect((await ask({}, basic(client))).status).toBe(200);
    expect((await ask({}, basic(rotated))).status).toBe(200);
    house.clock.advance(86_400_000 + 1000);
    expect((await ask({}, basic(client))).status).toBe(401);
    expect((await ask({}, basic(rotated))).status).toBe(200);
    // The clock went past the session.
    admin = await signedIn(house, { roles: ['itadmin'] });
  });

  test('whose secret is known to somebody gets another at once, and the old one is refused', async () => {
    const client = await made();
    await call(rotateRoute, {
      params: { id: client.clientId },
      body: { version: 1, atOnce: true },
      cookie: admin.cookie,
    });
    expect((await ask({}, basic(client))).status).toBe(401);
  });

  test('that is revoked is refused at once, with tokens that it has', async () => {
    const client = await made();
    const token = await tokenFor(client);
    const revoke = () =>
      call(revokeRoute, {
        params: { id: client.clientId },
        body: { version: 1, reason: 'Contract ended' },
        cookie: admin.cookie,
      });
    const answers = await Promise.all([revoke(), revoke()]);
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 409]);
    expect((await problemOf(await read(devicesRoute, token))).code).toBe('access-token-refused');
    expect(await (await ask({}, basic(client))).json()).toMatchObject({ error: 'invalid_client' });
  });

  test('does not get in with a wrong secret, no secret, or somebody else’s', async () => {
    const [one, other] = [await made(), await made()];
    for (const authorization of [
      basic({ ...one, secret: 'wrong' }),
      basic({ ...one, secret: other.secret }),
      basic({ clientId: 'nobody', secret: one.secret }),
      basic({ ...one, secret: '' }),
      'Basic !!!',
      `Bearer ${one.secret}`,
      '',
    ]) {
      const answer = await ask({}, authorization);
      expect(answer.status, authorization).toBe(401);
      expect(answer.headers.get('www-authenticate')).toBe('Basic realm="Bellkeep"');
      expect(answer.headers.get('content-type')).toBe('application/json');
      expect(await answer.json()).toMatchObject({ error: 'invalid_client' });
    }
  });

  test('gets nothing by another grant or another form', async () => {
    const client = await made();
    expect(await (await ask({ grant_type: 'password' }, basic(client))).json()).toMatchObject({
      error: 'unsupported_grant_type',
    });
    const json = await call(tokenRoute, {
      body: { grant_type: 'client_credentials' },
      headers: { origin: '' },
    });
    expect(json.status).toBe(415);
    const twice = await call(tokenRoute, {
      body: 'grant_type=client_credentials&scope=a&scope=b',
      headers: { 'content-type': 'application/x-www-form-urlencoded', authorization: basic(client) },
    });
    expect(await twice.json()).toMatchObject({ error: 'invalid_request' });
  });
});

describe('a client with keys', () => {
  async function withKeys(alg = 'ES256') {
    const pair = await generateKeyPair(alg, { extractable: true });
    const jwk = { ...(await exportJWK(pair.publicKey)), kid: 'one', alg };
    const client = await made({ publicKeys: { keys: [jwk] } });
    const assertion = (more: Record<string, unknown> = {}, key = pair.privateKey) =>
      new SignJWT({
        iss: client.clientId,
        sub: client.clientId,
        aud: `${ORIGIN}/api/v1/token`,
        jti: crypto.randomUUID(),
        exp: Math.floor(house.clock.now() / 1000) + 60,
        ...more,
      })
        .setProtectedHeader({ alg, kid: 'one' })
        .sign(key);
    return { client, assertion, pair };
  }
  const send = (assertion: string) =>
    ask({
      client_assertion_type: 'urn:ietf:params:oauth:client-assertion-type:jwt-bearer',
      client_assertion: assertion,
    });

  test.each(['ES256', 'EdDSA', 'PS256'])('signs in by an assertion with %s, once', async (alg) => {
    const { assertion, client } = await withKeys(alg);
    expect(client.secret).toBeNull();
    const one = await assertion();
    expect((await send(one)).status).toBe(200);
    expect((await send(one)).status).toBe(401);
  });

  test('is refused with an assertion for somebody else, one that lives too long, has ended, or is of another key', async () => {
    const { assertion } = await withKeys();
    const now = Math.floor(house.clock.now() / 1000);
    const stranger = await generateKeyPair('ES256');
    for (const bad of [
      await assertion({ aud: 'https://elsewhere.example' }),
      await assertion({ iss: 'somebody' }),
      await assertion({ exp: now + 3600 }),
      await assertion({ exp: now - 60 }),
      await assertion({ jti: undefined }),
      await assertion({}, stranger.privateKey),
      'not.a.token',
      `${Buffer.from('{"alg":"none"}').toString('base64url')}.${(await assertion()).split('.')[1]}.`,
    ])
      expect((await send(bad)).status).toBe(401);
  });

  test('whose clock is off by as much as policy allows is let in', async () => {
    const { assertion } = await withKeys();
    const now = Math.floor(house.clock.now() / 1000);
    expect((await send(await assertion({ exp: now - 20 }))).status).toBe(200);
  });

  test('is not made with a private key, a shared secret, or no key at all', async () => {
    const pair = await generateKeyPair('ES256', { extractable: true });
    const secret: JWK = { kty: 'oct', k: 'c2VjcmV0' };
    for (const key of [await exportJWK(pair.privateKey), secret, { kty: 'EC', crv: 'P-256' }]) {
      const answer = await create({ publicKeys: { keys: [key] } });
      expect((await problemOf(answer)).code).toBe('body-invalid');
    }
  });
});

describe('an access token', () => {
  test('of a device does not open this door, and this one not a device’s', async () => {
    const client = await made();
    const token = await tokenFor(client);
    const key = await currentSigningKey(house.services, 'device-token');
    const foreign = await new SignJWT({ scope: 'devices.read' })
      .setProtectedHeader({ alg: key.algorithm, kid: key.kid, typ: 'at+jwt' })
      .setIssuer(ORIGIN)
      .setAudience(`${ORIGIN}/api/v1`)
      .setSubject(client.clientId)
      .setJti('1')
      .setIssuedAt()
      .setExpirationTime('1h')
      .sign(await privateKeyOf(house.services, key));
    expect((await read(devicesRoute, foreign)).status).toBe(401);
    const request = new Request(`${ORIGIN}/api/device/v1/heartbeat`, {
      method: 'POST',
      headers: { authorization: `Bearer ${token}` },
    });
    await expect(authenticateDevice(house.services, request, request.url)).rejects.toMatchObject({
      code: 'token-invalid',
    });
  });

  test('ends after ten minutes, and is refused when a byte of it is changed', async () => {
    const token = await tokenFor(await made());
    const [head, payload, signature = ''] = token.split('.');
    const flipped = signature.startsWith('A') ? `B${signature.slice(1)}` : `A${signature.slice(1)}`;
    expect((await read(devicesRoute, `${head}.${payload}.${flipped}`)).status).toBe(401);
    house.clock.advance(601_000);
    expect((await read(devicesRoute, token)).status).toBe(401);
  });
});

describe('what is read', () => {
  test('is paged, holds no patient, and each page that is taken is in the log', async () => {
    const ward = await house.ward('Juniper');
    const patient = await house.patient();
    await house.encounter(patient, { wardId: ward });
    const device = await house.device({ wardId: ward });
    for (let i = 0; i < 3; i++) await house.clip({ device });
    const token = await tokenFor(await made({ name: 'Pager' }));
    const seen: string[] = [];
    let after = '';
    for (let page = 0; page < 10; page++) {
      const answer = await read(recordingsRoute, token, `/api/v1/recordings?limit=2${after}`);
      const text = await answer.text();
      expect(text).not.toContain(patient.familyName);
      expect(text).not.toContain(patient.recordNumber);
      const body = JSON.parse(text) as { rows: { number: string; assetTag: string }[]; next: string | null };
      seen.push(...body.rows.map(({ number }) => number));
      if (body.next === null) break;
      after = `&after=${encodeURIComponent(body.next)}`;
    }
    expect(new Set(seen).size).toBe(3);
    expect(seen).toHaveLength(3);
    const exports = (await entriesOf(house)).filter(({ kind }) => kind === 'exported');
    expect(exports.map(({ detail }) => detail)).toEqual([
      { to: 'Pager', count: 2 },
      { to: 'Pager', count: 1 },
    ]);
    expect(exports[0]?.subjects.map(({ kind }) => kind)).toEqual(['client', 'recording', 'recording']);
  });

  test('of the ledger is every entry as it is hashed', async () => {
    const token = await tokenFor(await made({ scopes: ['ledger.read'] }));
    const answer = await read(ledgerRoute, token, '/api/v1/ledger?limit=5');
    const { rows, next } = (await answer.json()) as {
      rows: { sequence: number; canonical: string; leafHash: string }[];
      next: string;
    };
    expect(rows.map(({ sequence }) => sequence)).toEqual([0, 1, 2, 3, 4]);
    expect(next).toBe('4');
    expect(JSON.parse(rows[0]?.canonical ?? '')).toMatchObject({ sequence: 0 });
    expect(rows[0]?.leafHash).toMatch(/^[0-9a-f]{64}$/);
  });

  test('is asked for with parameters that are right', async () => {
    const token = await tokenFor(await made());
    expect((await read(devicesRoute, token, '/api/v1/devices?limit=9999')).status).toBe(400);
    expect((await read(devicesRoute, token, '/api/v1/devices?unknown=1')).status).toBe(400);
  });
});

test('the list finds a client by its name or id, and says when it was last used', async () => {
  const client = await made({ name: 'Needle 100%' });
  await tokenFor(client);
  for (const q of ['eedle 100%', client.clientId]) {
    const answer = await call(listRoute, {
      path: `/api/clients?q=${encodeURIComponent(q)}`,
      cookie: admin.cookie,
    });
    const { rows } = (await answer.json()) as { rows: { id: string; lastUsedAt: number }[] };
    expect(rows.map(({ id }) => id)).toEqual([client.clientId]);
    expect(rows[0]?.lastUsedAt).toBeGreaterThan(0);
  }
  const none = await call(listRoute, { path: '/api/clients?q=100_', cookie: admin.cookie });
  expect(await none.json()).toMatchObject({ rows: [] });
});
