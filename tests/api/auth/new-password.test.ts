import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as changeRoute } from '@/app/api/account/password/route';
import { POST as forgotRoute } from '@/app/api/auth/forgot/route';
import { POST as resetRoute } from '@/app/api/auth/reset/route';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { GET as me } from '@/app/api/me/route';
import { account, outbox, user } from '@/db/schema';
import { call, problemOf } from '@/tests/support/call';
import { entriesOf, kindsOf } from '@/tests/support/entries';
import { addPerson, PASSWORD, sessionOf, signedIn, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

const FRESH = 'tangerine otter quarry';
let house: House;
let person: TestPerson;
beforeEach(async () => {
  house = await openHouse();
  person = await addPerson(house, { roles: ['clinician'] });
});
afterEach(() => house.close());

const forgot = (email = person.email) => call(forgotRoute, { body: { email } });
const reset = (token: string, newPassword = FRESH) => call(resetRoute, { body: { token, newPassword } });
const signIn = (password: string) => call(signInRoute, { body: { email: person.email, password } });

/** Ask for a new password and take the token out of the mail, as its reader does. */
async function tokenByMail(): Promise<string> {
  await forgot();
  const { text } = (await house.deliver()).at(-1) ?? { text: '' };
  return /\/reset\/([\w-]+)/.exec(text)?.[1] ?? '';
}

describe('a new password by mail', () => {
  test('the address in the mail sets it, ends all sessions, and tells the person', async () => {
    const cookie = await sessionOf(house, person);
    const token = await tokenByMail();
    expect((await reset(token)).status).toBe(200);
    expect((await call(me, { cookie })).status).toBe(401);
    expect((await signIn(PASSWORD)).status).toBe(401);
    expect((await signIn(FRESH)).status).toBe(200);
    expect((await house.deliver()).at(-1)).toMatchObject({
      to: person.email,
      subject: 'Your password for Bellkeep was changed',
    });
    expect(await entriesOf(house)).toContainEqual(
      expect.objectContaining({
        kind: 'password-reset',
        detail: { how: 'by mail', sessionsEnded: 1 },
        subjects: [{ kind: 'person', id: person.id }],
      }),
    );
  });

  test('it works once', async () => {
    const token = await tokenByMail();
    expect((await reset(token)).status).toBe(200);
    expect((await problemOf(await reset(token, 'another one entirely'))).code).toBe('not-found');
    expect((await signIn(FRESH)).status).toBe(200);
  });

  test('twice at the same moment sets one password', async () => {
    const token = await tokenByMail();
    const answers = await Promise.all([reset(token, FRESH), reset(token, 'mulberry anvil sextant')]);
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 404]);
  });

  test('it stops working after an hour', async () => {
    const token = await tokenByMail();
    house.clock.advance(3_600_001);
    expect((await reset(token)).status).toBe(404);
    expect((await signIn(PASSWORD)).status).toBe(200);
  });

  test('a second mail leaves the first one working until one of them is used', async () => {
    const first = await tokenByMail();
    const second = await tokenByMail();
    expect(second).not.toBe(first);
    expect((await reset(first)).status).toBe(200);
    expect((await reset(second, 'mulberry anvil sextant')).status).toBe(404);
  });

  test('a password that will not do leaves the address working', async () => {
    const token = await tokenByMail();
    expect((await problemOf(await reset(token, 'password1234'))).code).toBe('body-invalid');
    expect((await problemOf(await reset(token, `${person.name} 2026!`))).code).toBe('body-invalid');
    expect((await reset(token)).status).toBe(200);
  });

  test('for an unknown address the answer is the same and nothing is sent', async () => {
    const known = await forgot();
    const unknown = await forgot('stranger@elsewhere.example');
    expect(unknown.status).toBe(known.status);
    expect(await unknown.text()).toBe(await known.text());
    expect(await house.deliver()).toHaveLength(1);
  });

  test('nobody gets more than three of these mails an hour', async () => {
    for (let i = 0; i < 5; i++) expect((await forgot()).status).toBe(200);
    expect(await house.deliver()).toHaveLength(3);
    house.clock.advance(3_600_001);
    await forgot();
    expect(await house.deliver()).toHaveLength(4);
  });

  test('somebody who left gets none', async () => {
    await house.services.write(async (tx) => {
      await tx.update(user).set({ leftAt: 1 }).where(eq(user.id, person.id));
    });
    expect((await forgot()).status).toBe(200);
    expect(await house.deliver()).toEqual([]);
  });

  test('once it is sent, the token is kept nowhere', async () => {
    const token = await tokenByMail();
    const dump: string[] = [];
    const tables = await house.services.database.client.execute(
      "select name from sqlite_schema where type = 'table'",
    );
    for (const { name } of tables.rows) {
      const { rows } = await house.services.database.client.execute(`select * from "${String(name)}"`);
      dump.push(JSON.stringify(rows));
    }
    expect(token).toHaveLength(43);
    expect(dump.join()).not.toContain(token);
    expect(house.log.join()).not.toContain(token);
    const [row] = await house.services.read.select().from(outbox);
    expect(row).toMatchObject({ payload: {}, lastError: null });
  });
});

describe('changing one’s own password', () => {
  test('takes the present one, keeps this session and ends the others', async () => {
    const here = await signedIn(house, { roles: ['clinician'] });
    const elsewhere = await sessionOf(house, here);
    const answer = await call(changeRoute, {
      body: { current: PASSWORD, fresh: FRESH },
      cookie: here.cookie,
    });
    expect(await answer.json()).toEqual({ sessionsEnded: 1 });
    expect((await call(me, { cookie: here.cookie })).status).toBe(200);
    expect((await call(me, { cookie: elsewhere })).status).toBe(401);
    expect((await house.deliver()).at(-1)).toMatchObject({ to: here.email });
    expect(await kindsOf(house)).toEqual(['password-reset']);
  });

  test('a wrong present one changes nothing, and guessing at it has to wait', async () => {
    const { id, cookie } = await signedIn(house, { roles: ['clinician'] });
    const before = await house.services.read.select().from(account).where(eq(account.userId, id));
    const change = () => call(changeRoute, { body: { current: 'wrong wrong wrong', fresh: FRESH }, cookie });
    for (let i = 0; i < 5; i++)
      expect((await problemOf(await change())).body).toMatchObject({ errors: [{ path: 'current' }] });
    expect((await change()).status).toBe(429);
    expect(await house.services.read.select().from(account).where(eq(account.userId, id))).toEqual(before);
  });

  test('a mail that was on its way stops working', async () => {
    const token = await tokenByMail();
    const cookie = await sessionOf(house, person);
    expect((await call(changeRoute, { body: { current: PASSWORD, fresh: FRESH }, cookie })).status).toBe(200);
    expect((await reset(token, 'mulberry anvil sextant')).status).toBe(404);
  });
});
