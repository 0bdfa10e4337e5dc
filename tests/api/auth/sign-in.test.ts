import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as signOutRoute } from '@/app/api/account/sign-out/route';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { GET as me } from '@/app/api/me/route';
import { session, user } from '@/db/schema';
import { call, cookiesAfter, problemOf } from '@/tests/support/call';
import { entriesOf, kindsOf } from '@/tests/support/entries';
import { addPerson, PASSWORD } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
beforeEach(async () => {
  house = await openHouse();
});
afterEach(() => house.close());

const signIn = (email: string, password: string, from?: string) =>
  call(signInRoute, { body: { email, password }, ...(from ? { from } : {}) });

describe('sign-in', () => {
  test('the right password gives a session whose cookie scripts cannot read and other sites cannot send', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const answer = await signIn(person.email.toUpperCase(), PASSWORD);
    expect(answer.status).toBe(200);
    expect(await answer.json()).toEqual({ next: 'in' });
    const [line] = answer.headers.getSetCookie();
    expect(line).toMatch(/^__Secure-bellkeep\.session_token=/);
    expect(line).toMatch(/; HttpOnly/i);
    expect(line).toMatch(/; Secure/i);
    expect(line).toMatch(/; SameSite=Lax/i);
    expect(line).toMatch(/; Max-Age=43200/i);
    const answered = await call(me, { cookie: cookiesAfter(answer) });
    expect(await answered.json()).toMatchObject({ id: person.id, roles: ['clinician'] });
    expect(await kindsOf(house)).toEqual(['signed-in']);
  });

  test('each sign-in has a session id of its own, whatever session cookie came with it', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const first = cookiesAfter(await signIn(person.email, PASSWORD));
    const second = cookiesAfter(
      await call(signInRoute, { body: { email: person.email, password: PASSWORD }, cookie: first }),
    );
    expect(second).not.toBe(first);
    const rows = await house.services.read.select().from(session).where(eq(session.userId, person.id));
    expect(rows).toHaveLength(2);
  });

  test('an unknown account and a wrong password are answered alike, and nobody’s address is kept', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const wrong = await problemOf(await signIn(person.email, 'not the password at all'));
    const unknown = await problemOf(await signIn('stranger@elsewhere.example', 'not the password at all'));
    const without = ({ requestId: _, ...rest }: Record<string, unknown>) => rest;
    expect(wrong.code).toBe('sign-in-refused');
    expect(without(unknown.body)).toEqual(without(wrong.body));
    expect(await entriesOf(house)).toMatchObject([
      { kind: 'sign-in-refused', subjects: [{ kind: 'person', id: person.id }] },
    ]);
    const dump = JSON.stringify([
      await house.services.database.client.execute('select * from sign_in_try'),
      await house.services.database.client.execute('select * from custody_entry'),
      await house.services.database.client.execute('select * from rate_limit'),
    ]);
    expect(dump).not.toContain('stranger');
    expect(house.log.join()).not.toContain('stranger');
  });

  test('somebody who left is answered like a wrong password', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    await house.services.write(async (tx) => {
      await tx.update(user).set({ leftAt: 1 }).where(eq(user.id, person.id));
    });
    const answer = await signIn(person.email, PASSWORD);
    expect(answer.status).toBe(401);
    expect(answer.headers.getSetCookie()).toEqual([]);
    expect((await problemOf(answer)).code).toBe('sign-in-refused');
    expect(await house.services.read.select().from(session)).toEqual([]);
  });

  test('a body with more in it than e-mail and password is refused', async () => {
    const answer = await call(signInRoute, {
      body: { email: 'a@b.example', password: 'x', callbackURL: 'https://evil.example' },
    });
    expect((await problemOf(answer)).code).toBe('body-invalid');
  });

  test('signing out ends the session itself and not only its cookie', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const cookie = cookiesAfter(await signIn(person.email, PASSWORD));
    const out = await call(signOutRoute, { method: 'POST', cookie });
    expect(out.status).toBe(303);
    expect(out.headers.get('location')).toBe('/sign-in');
    expect(out.headers.getSetCookie().join()).toMatch(/session_token=;.*Max-Age=0/i);
    expect((await call(me, { cookie })).status).toBe(401);
  });
});

describe('a session', () => {
  test('ends after two hours without use', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const cookie = cookiesAfter(await signIn(person.email, PASSWORD));
    house.clock.advance(119 * 60_000);
    expect((await call(me, { cookie })).status).toBe(200);
    house.clock.advance(119 * 60_000);
    expect((await call(me, { cookie })).status).toBe(200);
    house.clock.advance(121 * 60_000);
    expect((await call(me, { cookie })).status).toBe(401);
  });

  test('ends after twelve hours however much it is used', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const cookie = cookiesAfter(await signIn(person.email, PASSWORD));
    for (let hour = 1; hour <= 11; hour++) {
      house.clock.advance(3_600_000);
      expect((await call(me, { cookie })).status).toBe(200);
    }
    house.clock.advance(3_700_000);
    expect((await call(me, { cookie })).status).toBe(401);
  });

  test('a cookie with one changed character signs nobody in', async () => {
    const person = await addPerson(house, { roles: ['clinician'] });
    const cookie = cookiesAfter(await signIn(person.email, PASSWORD));
    const at = cookie.indexOf('=') + 3;
    const other = `${cookie.slice(0, at)}${cookie[at] === 'A' ? 'B' : 'A'}${cookie.slice(at + 1)}`;
    expect((await call(me, { cookie: other })).status).toBe(401);
  });
});
