import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as removeRoute } from '@/app/api/account/passkeys/[id]/remove/route';
import { POST as planRoute } from '@/app/api/account/passkeys/options/route';
import { POST as addRoute } from '@/app/api/account/passkeys/route';
import { POST as optionsRoute } from '@/app/api/auth/passkey/options/route';
import { POST as passkeyRoute } from '@/app/api/auth/passkey/route';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { GET as me } from '@/app/api/me/route';
import { POST as removeFactorRoute } from '@/app/api/people/[id]/remove-second-factor/route';
import { GET as people } from '@/app/api/people/route';
import { passkey, session } from '@/db/schema';
import { personLeaves } from '@/lib/identity/personLeaves';
import { type Lie, type SoftAuthenticator, softAuthenticator } from '../../support/authenticator';
import { call, cookiesAfter, problemOf } from '../../support/call';
import { entriesOf, kindsOf } from '../../support/entries';
import { addPerson, authorityOf, PASSWORD, sessionOf, type TestPerson } from '../../support/people';
import { type House, ORIGIN, openHouse } from '../../support/services';

let house: House;
let person: TestPerson;
let phone: SoftAuthenticator;
beforeEach(async () => {
  house = await openHouse();
  person = await addPerson(house, { roles: ['itadmin'], secondFactor: false });
  phone = softAuthenticator(ORIGIN);
});
afterEach(() => house.close());

interface Begun {
  handle: string;
  options: { challenge: string; user: { id: string }; excludeCredentials: { id: string }[] };
}
const plan = (cookie: string, password = PASSWORD) => call(planRoute, { body: { password }, cookie });
async function add(cookie: string, key = phone, lie: Lie = {}, name = 'My phone') {
  const { handle, options } = (await (await plan(cookie)).json()) as Begun;
  return await call(addRoute, { body: { handle, name, answer: key.register(options, lie) }, cookie });
}
const begin = async () => (await (await call(optionsRoute, { body: {} })).json()) as Begun;
async function show(key = phone, lie: Lie = {}) {
  const { handle, options } = await begin();
  return await call(passkeyRoute, { body: { handle, answer: key.sign(options, lie) } });
}
const password = (who = person) => call(signInRoute, { body: { email: who.email, password: PASSWORD } });

describe('a passkey', () => {
  test('is added with the password, is told by mail and in the log, and ends the sessions elsewhere', async () => {
    const cookie = await sessionOf(house, person);
    const elsewhere = await sessionOf(house, person);
    expect((await add(cookie)).status).toBe(200);
    expect((await call(me, { cookie })).status).toBe(200);
    expect((await call(me, { cookie: elsewhere })).status).toBe(401);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'passkey-added',
      actor: { id: person.id },
      detail: { name: 'My phone' },
    });
    expect((await house.deliver()).map(({ subject }) => subject)).toEqual([
      'A passkey was added for Bellkeep',
    ]);
  });

  test('is the second factor that an IT administrator needs', async () => {
    const cookie = await sessionOf(house, person);
    expect((await problemOf(await call(people, { cookie }))).code).toBe('second-factor-required');
    await add(cookie);
    expect((await call(people, { cookie })).status).toBe(200);
  });

  test('signs in by itself, and the log says by what', async () => {
    await add(await sessionOf(house, person));
    const answer = await show();
    expect(await answer.json()).toEqual({ next: 'in' });
    expect((await call(people, { cookie: cookiesAfter(answer) })).status).toBe(200);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'signed-in',
      detail: { secondFactor: 'passkey' },
    });
  });

  test('is asked for after the password, and no session comes of the password alone', async () => {
    await add(await sessionOf(house, person));
    await house.services.write((tx) => tx.delete(session).where(eq(session.userId, person.id)));
    const answer = await password();
    expect(await answer.json()).toEqual({ next: 'passkey' });
    expect(answer.headers.getSetCookie()).toEqual([]);
    expect(await house.services.read.select().from(session)).toEqual([]);
  });

  test('of somebody with an authenticator leaves the code as the other way in', async () => {
    const both = await addPerson(house, { roles: ['itadmin'], secondFactor: true });
    await add(await sessionOf(house, both));
    expect(await (await password(both)).json()).toEqual({ next: 'second-factor' });
    expect(await (await show()).json()).toEqual({ next: 'in' });
  });

  test('is removed with the password; then it opens nothing', async () => {
    const cookie = await sessionOf(house, person);
    await add(cookie);
    const gone = await call(removeRoute, { params: { id: phone.id }, body: { password: PASSWORD }, cookie });
    expect(gone.status).toBe(200);
    expect((await problemOf(await show())).code).toBe('sign-in-refused');
    expect(await kindsOf(house)).toContain('passkey-removed');
  });

  test('of somebody else is not there', async () => {
    await add(await sessionOf(house, person));
    const other = await addPerson(house, { roles: ['itadmin'] });
    const cookie = await sessionOf(house, other);
    const answer = await call(removeRoute, {
      params: { id: phone.id },
      body: { password: PASSWORD },
      cookie,
    });
    expect((await problemOf(answer)).code).toBe('not-found');
    expect(await house.services.read.select().from(passkey)).toHaveLength(1);
  });

  test('goes when an administrator takes the second factor away, and when its holder leaves', async () => {
    await add(await sessionOf(house, person));
    const other = await addPerson(house, { roles: ['itadmin'] });
    const cookie = await sessionOf(house, other);
    const answer = await call(removeFactorRoute, {
      params: { id: person.id },
      body: { reason: 'Lost the phone' },
      cookie,
    });
    expect(answer.status).toBe(200);
    expect(await house.services.read.select().from(passkey)).toEqual([]);
    phone = softAuthenticator(ORIGIN);
    await add(await sessionOf(house, person));
    await personLeaves(house.services, authorityOf<'people.write'>(other), person.id, 'Moved away');
    expect(await house.services.read.select().from(passkey)).toEqual([]);
    expect((await problemOf(await show())).code).toBe('sign-in-refused');
  });
});

describe('adding is refused', () => {
  test('with a wrong password', async () => {
    const answer = await plan(await sessionOf(house, person), 'not my password');
    expect((await problemOf(answer)).code).toBe('body-invalid');
  });

  test.each<[string, Lie]>([
    ['made for another site', { origin: 'https://evil.example' }],
    ['made for another host', { rpId: 'evil.example' }],
    ['over another challenge', { challenge: 'AAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAA' }],
    ['without the person having shown themselves', { userVerified: false }],
  ])('%s', async (_what, lie) => {
    expect((await problemOf(await add(await sessionOf(house, person), phone, lie))).code).toBe(
      'body-invalid',
    );
    expect(await house.services.read.select().from(passkey)).toEqual([]);
  });

  test('by the handle of somebody else, and by a handle that was used', async () => {
    const other = await addPerson(house, { roles: ['clinician'] });
    const { handle, options } = (await (await plan(await sessionOf(house, other))).json()) as Begun;
    const cookie = await sessionOf(house, person);
    const body = { handle, name: 'Not mine', answer: phone.register(options) };
    expect((await call(addRoute, { body, cookie })).status).toBe(400);
    expect((await call(addRoute, { body, cookie: await sessionOf(house, other) })).status).toBe(400);
  });

  test('of the same passkey for a second person', async () => {
    await add(await sessionOf(house, person));
    const other = await addPerson(house, { roles: ['clinician'] });
    expect((await add(await sessionOf(house, other))).status).toBe(400);
    const rows = await house.services.read.select().from(passkey);
    expect(rows.map(({ personId }) => personId)).toEqual([person.id]);
  });

  test('after ten minutes', async () => {
    const cookie = await sessionOf(house, person);
    const { handle, options } = (await (await plan(cookie)).json()) as Begun;
    house.clock.advance(601_000);
    const body = { handle, name: 'Late', answer: phone.register(options) };
    expect((await call(addRoute, { body, cookie })).status).toBe(400);
  });
});

describe('signing in is refused', () => {
  beforeEach(async () => {
    expect((await add(await sessionOf(house, person))).status).toBe(200);
  });

  test.each<[string, Lie]>([
    ['on another site', { origin: 'https://evil.example' }],
    ['for another host', { rpId: 'evil.example' }],
    ['over another challenge', { challenge: 'AAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAA' }],
    ['without PIN or finger', { userVerified: false }],
  ])('%s, and the log says so', async (_what, lie) => {
    expect((await problemOf(await show(phone, lie))).code).toBe('sign-in-refused');
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'sign-in-refused',
      subjects: [{ kind: 'person', id: person.id }],
    });
  });

  test('with a counter that stands still, as a copy’s would', async () => {
    await show();
    await show();
    expect((await show(phone, { counter: 2 })).status).toBe(401);
  });

  test('with an answer that was sent before', async () => {
    const { handle, options } = await begin();
    const body = { handle, answer: phone.sign(options) };
    const answers = await Promise.all([call(passkeyRoute, { body }), call(passkeyRoute, { body })]);
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 401]);
  });

  test('with a passkey that nobody added, in the same words as with a wrong one', async () => {
    const stranger = await problemOf(await show(softAuthenticator(ORIGIN)));
    const wrong = await problemOf(await show(phone, { userVerified: false }));
    expect({ ...stranger.body, requestId: '' }).toEqual({ ...wrong.body, requestId: '' });
  });
});
