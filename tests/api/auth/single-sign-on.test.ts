import { createHash } from 'node:crypto';
import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { eq } from 'drizzle-orm';
import Provider, { type ClientMetadata } from 'oidc-provider';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { GET as callbackRoute } from '@/app/api/auth/single-sign-on/callback/route';
import { GET as beginRoute } from '@/app/api/auth/single-sign-on/route';
import { GET as me } from '@/app/api/me/route';
import { account, invitation, personRole, session, user } from '@/db/schema';
import { invitePerson } from '@/lib/identity/invitePerson';
import { call, cookiesAfter } from '../../support/call';
import { entriesOf, kindsOf } from '../../support/entries';
import { addPerson, authorityOf, type TestPerson } from '../../support/people';
import { type House, ORIGIN, openHouse } from '../../support/services';

interface Account {
  email: string;
  email_verified: boolean;
  [claim: string]: unknown;
}
/** Who is at the provider, by subject; a test says who. */
const accounts = new Map<string, Account>();
/** How the provider's people signed in there. */
let amr: string[] = [];
let server: Server;
let issuer: string;
let house: House;
let admin: TestPerson;

const CLIENT: ClientMetadata = {
  client_id: 'bellkeep',
  client_secret: 'a secret + with % signs',
  redirect_uris: [`${ORIGIN}/api/auth/single-sign-on/callback`],
};

beforeAll(async () => {
  server = createServer();
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  issuer = `http://127.0.0.1:${(server.address() as AddressInfo).port}`;
  const provider = new Provider(issuer, {
    clients: [CLIENT],
    claims: {
      openid: ['sub', 'amr'],
      email: ['email', 'email_verified'],
      profile: ['name', 'roles', 'groups'],
    },
    pkce: { required: () => true },
    cookies: { keys: ['a key for tests'] },
    features: { devInteractions: { enabled: false } },
    interactions: { url: (_ctx, interaction) => `/interaction/${interaction.uid}` },
    findAccount: (_ctx, sub) => ({ accountId: sub, claims: async () => ({ sub, ...accounts.get(sub) }) }),
  });
  const answer = provider.callback();
  server.on('request', async (request, response) => {
    const url = new URL(request.url ?? '/', issuer);
    // The person at the provider agrees to everything: who they are stands in the address.
    if (!url.pathname.startsWith('/interaction/')) return void answer(request, response);
    const { prompt, params, grantId } = await provider.interactionDetails(request, response);
    const accountId = String(request.headers['x-subject']);
    if (prompt.name === 'login')
      return void (await provider.interactionFinished(request, response, { login: { accountId, amr } }));
    const grant =
      (grantId && (await provider.Grant.find(grantId))) ||
      new provider.Grant({
        accountId,
        clientId: String(params.client_id),
      });
    grant.addOIDCScope('openid email profile');
    await provider.interactionFinished(
      request,
      response,
      { consent: { grantId: await grant.save() } },
      { mergeWithLastSubmission: true },
    );
  });
});
afterAll(async () => {
  server.closeAllConnections();
  await new Promise((resolve) => server.close(resolve));
});
beforeEach(async () => {
  amr = [];
  accounts.clear();
  house = await openHouse({ env: settings() });
  admin = await addPerson(house, { roles: ['itadmin'] });
});
afterEach(() => house.close());

const settings = (more: Record<string, string> = {}) => ({
  PRIVATE_ADDRESSES_ALLOWED: '127.0.0.0/8',
  SIGN_ON_ISSUER: issuer,
  SIGN_ON_CLIENT_ID: 'bellkeep',
  SIGN_ON_CLIENT_SECRET: 'a secret + with % signs',
  ...more,
});

/** Walk a browser through the provider, up to the address that leads back. */
async function throughProvider(start: string, subject: string): Promise<URL> {
  const jar = new Map<string, string>();
  let at = new URL(start);
  for (let hop = 0; hop < 12; hop++) {
    const response = await fetch(at, {
      redirect: 'manual',
      headers: { cookie: [...jar].map(([k, v]) => `${k}=${v}`).join('; '), 'x-subject': subject },
    });
    for (const line of response.headers.getSetCookie()) {
      const [pair = ''] = line.split(';');
      jar.set(pair.slice(0, pair.indexOf('=')), pair.slice(pair.indexOf('=') + 1));
    }
    const location = response.headers.get('location');
    if (!location) throw new Error(`the provider stopped with ${response.status}: ${await response.text()}`);
    at = new URL(location, at);
    if (at.origin === ORIGIN) return at;
  }
  throw new Error('the provider goes round in circles');
}

async function begin(next = '/keyroom') {
  const answer = await call(beginRoute, {
    path: `/api/auth/single-sign-on?next=${encodeURIComponent(next)}`,
  });
  return { address: answer.headers.get('location') ?? '', cookie: cookiesAfter(answer), answer };
}
const back = (url: URL, cookie: string) => call(callbackRoute, { path: url.pathname + url.search, cookie });

async function signOn(subject: string, next?: string) {
  const { address, cookie } = await begin(next);
  const answer = await back(await throughProvider(address, subject), cookie);
  return { answer, location: answer.headers.get('location'), cookie: cookiesAfter(answer) };
}
const REFUSED = `${ORIGIN}/sign-in?sign-on=refused`;

describe('somebody who is here', () => {
  test('signs in by their verified address, is linked once, and goes where they were going', async () => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', { email: person.email.toUpperCase(), email_verified: true });
    const { location, cookie } = await signOn('s-1', '/ledger?q=7');
    expect(location).toBe(`${ORIGIN}/ledger?q=7`);
    expect(await (await call(me, { cookie })).json()).toMatchObject({ id: person.id });
    expect((await signOn('s-1')).location).toBe(`${ORIGIN}/keyroom`);
    const kinds = await kindsOf(house);
    expect(kinds.filter((kind) => kind === 'sign-on-linked')).toHaveLength(1);
    expect(kinds.filter((kind) => kind === 'signed-in')).toHaveLength(2);
  });

  test('stays linked when the address at the provider changes', async () => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', { email: person.email, email_verified: true });
    await signOn('s-1');
    accounts.set('s-1', { email: 'married@elsewhere.example', email_verified: false });
    expect(await (await call(me, { cookie: (await signOn('s-1')).cookie })).json()).toMatchObject({
      id: person.id,
    });
  });

  test('is asked for their own second factor, unless the provider’s is believed and was asked for', async () => {
    accounts.set('s-1', { email: admin.email, email_verified: true });
    amr = ['pwd', 'mfa'];
    const first = await signOn('s-1');
    expect(first.location).toBe(`${ORIGIN}/sign-in?step=second-factor&next=%2Fkeyroom`);
    expect(first.cookie).not.toContain('session_token');
    expect(await house.services.read.select().from(session)).toEqual([]);
  });

  test('whose provider’s second factor is believed comes in with it, and not without', async () => {
    await house.close();
    house = await openHouse({ env: settings({ SIGN_ON_SECOND_FACTOR: 'provider' }) });
    admin = await addPerson(house, { roles: ['itadmin'] });
    accounts.set('s-1', { email: admin.email, email_verified: true });
    amr = ['pwd'];
    expect((await signOn('s-1')).location).toContain('step=second-factor');
    amr = ['pwd', 'mfa'];
    expect((await signOn('s-1')).location).toBe(`${ORIGIN}/keyroom`);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'signed-in',
      detail: { secondFactor: 'provider' },
    });
  });

  test('gets no role from what the provider says', async () => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', {
      email: person.email,
      email_verified: true,
      roles: ['itadmin'],
      groups: ['itadmin'],
    });
    const { cookie } = await signOn('s-1');
    expect(await (await call(me, { cookie })).json()).toMatchObject({ roles: ['auditor'] });
  });
});

describe('somebody who is invited', () => {
  const invite = (email: string) =>
    invitePerson(house.services, authorityOf<'people.write'>(admin), {
      email,
      name: 'Rowan Field',
      jobTitle: null,
      roles: ['biomed'],
      wardIds: [],
    });

  test('joins with the roles of the invitation, once', async () => {
    await invite('rowan@harrowmere.example');
    accounts.set('s-2', { email: 'rowan@harrowmere.example', email_verified: true });
    const { cookie } = await signOn('s-2');
    expect(await (await call(me, { cookie })).json()).toMatchObject({
      name: 'Rowan Field',
      roles: ['biomed'],
    });
    const [row] = await house.services.read.select().from(invitation);
    expect(row?.acceptedAt).not.toBeNull();
  });

  test('does not join when the address was not verified', async () => {
    await invite('rowan@harrowmere.example');
    accounts.set('s-2', { email: 'rowan@harrowmere.example', email_verified: false });
    expect((await signOn('s-2')).location).toBe(REFUSED);
    const [row] = await house.services.read.select().from(invitation);
    expect(row?.acceptedAt).toBeNull();
  });

  test('does not join after seven days', async () => {
    await invite('rowan@harrowmere.example');
    await house.services.write((tx) => tx.update(invitation).set({ expiresAt: house.clock.now() - 1 }));
    accounts.set('s-2', { email: 'rowan@harrowmere.example', email_verified: true });
    expect((await signOn('s-2')).location).toBe(REFUSED);
  });
});

describe('nobody comes in', () => {
  test('who was never invited, and no account comes of it', async () => {
    accounts.set('s-9', { email: 'stranger@harrowmere.example', email_verified: true });
    const { location, cookie } = await signOn('s-9');
    expect([location, cookie]).toEqual([REFUSED, '']);
    expect(await house.services.read.select().from(user)).toHaveLength(1);
  });

  test('who left', async () => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', { email: person.email, email_verified: true });
    await signOn('s-1');
    await house.services.write((tx) => tx.update(user).set({ leftAt: 1 }).where(eq(user.id, person.id)));
    expect((await signOn('s-1')).location).toBe(REFUSED);
  });

  test('who was given the address of somebody that is linked already', async () => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', { email: person.email, email_verified: true });
    await signOn('s-1');
    accounts.set('s-2', { email: person.email, email_verified: true });
    expect((await signOn('s-2')).location).toBe(REFUSED);
    const links = await house.services.read
      .select()
      .from(account)
      .where(eq(account.providerId, 'single-sign-on'));
    expect(links.map(({ accountId }) => accountId)).toEqual([`${issuer} s-1`]);
  });

  test.each([
    ['with another state', (url: URL) => url.searchParams.set('state', 'x'.repeat(43))],
    ['with another code', (url: URL) => url.searchParams.set('code', 'made-up')],
    ['without a code', (url: URL) => url.searchParams.delete('code')],
    ['from another provider', (url: URL) => url.searchParams.set('iss', 'https://evil.example')],
    ['from nobody in particular', (url: URL) => url.searchParams.delete('iss')],
  ])('%s', async (_what, spoil) => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', { email: person.email, email_verified: true });
    const { address, cookie } = await begin();
    const url = await throughProvider(address, 's-1');
    spoil(url);
    expect((await back(url, cookie)).headers.get('location')).toBe(REFUSED);
    expect(await house.services.read.select().from(session)).toEqual([]);
  });

  test('in a browser that did not set out, twice by one way, or with the way of another browser', async () => {
    const person = await addPerson(house, { roles: ['auditor'] });
    accounts.set('s-1', { email: person.email, email_verified: true });
    const { address, cookie } = await begin();
    const url = await throughProvider(address, 's-1');
    const other = await begin();
    expect((await back(url, '')).headers.get('location')).toBe(REFUSED);
    expect((await back(url, other.cookie)).headers.get('location')).toBe(REFUSED);
    expect((await back(url, cookie)).headers.get('location')).toBe(`${ORIGIN}/keyroom`);
    expect((await back(url, cookie)).headers.get('location')).toBe(REFUSED);
  });

  test('while the provider does not answer: the page says so', async () => {
    await house.close();
    house = await openHouse({ env: settings({ SIGN_ON_ISSUER: 'http://127.0.0.1:9' }) });
    expect((await begin()).address).toBe(`${ORIGIN}/sign-in?sign-on=unreachable`);
  });

  test('where it is not set up', async () => {
    await house.close();
    house = await openHouse();
    expect((await begin()).answer.status).toBe(404);
  });
});

test('the way out carries PKCE, state and nonce, none of them in the clear in the database', async () => {
  const { address, cookie, answer } = await begin();
  const asked = new URL(address).searchParams;
  expect(asked.get('code_challenge_method')).toBe('S256');
  expect(asked.get('code_challenge')).toMatch(/^[\w-]{43}$/);
  expect(asked.get('nonce')).toMatch(/^[\w-]{43}$/);
  const field = answer.headers.get('set-cookie') ?? '';
  expect(field).toMatch(/HttpOnly; SameSite=Lax; Secure$/);
  const row = await house.services.read.query.signInAttempt.findFirst();
  const handle = cookie.split('=')[1] ?? '';
  expect(row?.keyHash).toBe(createHash('sha256').update(handle).digest('hex'));
  for (const secret of [asked.get('state'), asked.get('nonce'), handle])
    expect(JSON.stringify(row)).not.toContain(secret);
});

test('an address elsewhere is not led to afterwards', async () => {
  const person = await addPerson(house, { roles: ['auditor'] });
  accounts.set('s-1', { email: person.email, email_verified: true });
  expect((await signOn('s-1', 'https://evil.example/')).location).toBe(`${ORIGIN}/`);
});

test('roles are only what was given here', async () => {
  expect(await house.services.read.select().from(personRole)).toHaveLength(1);
});
